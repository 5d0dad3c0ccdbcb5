"""Wells: the list, a well with everything along it, and recording by hand what no file brings."""

from collections import defaultdict
from typing import Any

from django import forms
from django.contrib import messages
from django.db.models import Count, OuterRef, Q, QuerySet, Subquery, Value
from django.db.models.functions import Coalesce
from django.forms import modelform_factory
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.views.decorators.http import require_http_methods, require_POST, require_safe

from labdata.access import Action, visible
from labdata.errors import NotFound
from labdata.models import Analysis, Project, Report, Result, Sample, Well
from labdata.pages.common import attempt, find, open_project, page_of, person
from labdata.registry.edits import ALONG, HEADER, add_along, edit_well, remove_along
from qc.models import Decision, Flag, Verdict
from qc.review.standing import valid_signature

ALONG_TITLES = {
    "top": "Formation tops",
    "core": "Core runs",
    "casing": "Casing shoes",
    "mud": "Drilling fluid",
    "station": "Deviation survey",
    "alias": "Other names",
    "identifier": "Further identifiers",
}
LABELS = {
    "top_md_m": "Top [m MD]", "base_md_m": "Base [m MD]", "md_m": "Depth [m MD]", "recovered_m": "Recovered [m]",
    "shift_to_log_m": "Shift to log [m]", "diameter_in": "Diameter [in]", "inclination_deg": "Inclination [°]",
    "azimuth_deg": "Azimuth [°]", "datum_kind": "Depth datum", "datum_elevation_m": "Datum elevation [m]",
    "ground_elevation_m": "Ground elevation [m]", "water_depth_m": "Water depth [m]", "td_md_m": "Total depth [m MD]",
    "latitude": "Latitude [°]", "longitude": "Longitude [°]", "crs": "Reference system",
}  # fmt: skip
RELATED = {"top": "tops", "core": "core_runs", "casing": "casing_shoes", "mud": "muds", "station": "survey",
           "alias": "aliases", "identifier": "identifiers"}  # fmt: skip


class WellForm(forms.ModelForm):  # type: ignore[type-arg]
    """The header of a well."""

    reason = forms.CharField(max_length=300, help_text="Why it is changed; the audit trail keeps it.")

    class Meta:
        model = Well
        fields = HEADER
        labels = LABELS


def of_project(request: HttpRequest, project: Project) -> QuerySet[Well]:
    """The project's wells, as far as the user may see them."""
    return visible(request.user, Well.objects.filter(project=project)).select_related("project")


@require_safe
def wells(request: HttpRequest, slug: str) -> HttpResponse:
    """Every well with its counts; ``q`` searches name, other names, UWI, operator and field."""
    project = open_project(request, slug)
    asked = request.GET.get("q", "").strip()
    rows = of_project(request, project)
    if asked:
        fits = Q(name__icontains=asked) | Q(uwi__icontains=asked) | Q(operator__icontains=asked)
        fits |= Q(field__icontains=asked) | Q(aliases__name__icontains=asked)
        rows = rows.filter(fits).distinct()
    page = page_of(request, _counted(rows))
    return render(request, "wells/wells.html", {"page": page, "q": asked})


def _counted(rows: QuerySet[Well]) -> QuerySet[Well]:
    """Wells with ``n_samples``, ``n_analyses`` and ``n_flags``."""
    return rows.annotate(
        n_samples=_count(Sample.objects.filter(well=OuterRef("pk")), "well"),
        n_analyses=_count(Analysis.objects.filter(sample__well=OuterRef("pk"), current=True), "sample__well"),
        n_flags=_count(Flag.objects.in_force().filter(well=OuterRef("pk")), "well"),
    )


def _count(rows: QuerySet[Any], by: str) -> Coalesce:
    return Coalesce(Subquery(rows.order_by().values(by).annotate(n=Count("pk")).values("n")), 0)


@require_safe
def well(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """One well: header, samples by depth, everything along it, reports, review sets, flags."""
    project = open_project(request, slug)
    at_hand = find(of_project(request, project), "well", pk=pk)
    samples = at_hand.samples.annotate(
        n_analyses=_count(Analysis.objects.filter(sample=OuterRef("pk"), current=True), "sample"),
        n_flags=_count(Flag.objects.in_force().filter(analysis__sample=OuterRef("pk")), "analysis__sample"),
    )
    flags = Flag.objects.in_force().filter(well=at_hand).order_by("rule")
    context = {
        "well": at_hand,
        "page": page_of(request, samples.order_by("top_md_m", "label", "pk"), 100),
        "flags": flags.values("rule", "severity").annotate(n=Count("pk")),
        "sets": _sets(at_hand),
        "reports": Report.objects.filter(analyses__sample__well=at_hand).select_related("laboratory", "source_file")
        .annotate(n=Count("analyses", filter=Q(analyses__sample__well=at_hand))),
    }  # fmt: skip
    return render(request, "wells/well.html", context)


def _sets(at_hand: Well) -> list[dict[str, Any]]:
    """The well's review sets, each with its signature and how many results stand at each verdict."""
    latest = Decision.objects.filter(result=OuterRef("pk")).order_by("-pk").values("verdict")[:1]
    current = Result.objects.filter(current=True, analysis__current=True, analysis__sample__well=at_hand)
    counted = (
        current.annotate(stands=Coalesce(Subquery(latest), Value(Verdict.UNDECIDED.value)))
        .order_by()
        .values_list("analysis__review_item__review_set", "stands")
        .annotate(n=Count("pk"))
    )
    counts: dict[int, dict[str, int]] = defaultdict(dict)
    for pk, verdict, number in counted:
        counts[pk][verdict] = number
    return [
        {"set": one, "signature": valid_signature(one), "counts": counts[one.pk]} for one in at_hand.review_sets.all()
    ]


@require_http_methods(["GET", "POST"])
def well_edit(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """The header form, and a short form for each kind of thing along the well."""
    project = open_project(request, slug, Action.REGISTER)
    at_hand = find(of_project(request, project), "well", pk=pk)
    form = WellForm(request.POST or None, instance=at_hand)
    if request.method == "POST" and form.is_valid():
        values = {name: form.cleaned_data[name] for name in HEADER}
        held = find(of_project(request, project), "well", pk=pk)
        reason = form.cleaned_data["reason"]
        changed = attempt(form, lambda: edit_well(user=person(request), well=held, values=values, reason=reason))
        if changed is not None:
            words = ", ".join(name.replace("_", " ") for name in changed) or "nothing, it was so already"
            messages.success(request, f"Changed: {words}. Flags follow with the next QC run.")
            return redirect("well", slug, pk)
    return render(request, "wells/well_edit.html", _desk(at_hand, form))


def _desk(at_hand: Well, form: forms.BaseForm, kind: str = "", sent: forms.BaseForm | None = None) -> dict[str, Any]:
    """What the edit page shows; ``sent`` is the refused form of ``kind``."""
    along = [
        {
            "kind": name,
            "title": title,
            "rows": getattr(at_hand, RELATED[name]).all(),
            "form": sent if sent is not None and name == kind else _along_form(name)(prefix=name),
        }
        for name, title in ALONG_TITLES.items()
    ]
    return {"well": at_hand, "form": form, "along": along}


def _along_form(kind: str) -> type[forms.ModelForm]:  # type: ignore[type-arg]
    if kind not in ALONG:
        raise NotFound(f"«{kind}» is nothing recorded along a well.", remedy=f"Kinds: {', '.join(ALONG)}.")
    fields = [f.name for f in ALONG[kind]._meta.concrete_fields if f.name not in {"id", "well", "name_key"}]
    return modelform_factory(ALONG[kind], fields=fields, labels=LABELS)


@require_POST
def well_add(request: HttpRequest, slug: str, pk: int, kind: str) -> HttpResponse:
    """Record one thing along the well."""
    project = open_project(request, slug, Action.REGISTER)
    at_hand = find(of_project(request, project), "well", pk=pk)
    form = _along_form(kind)(request.POST, prefix=kind)
    if form.is_valid():
        values = form.cleaned_data
        made = attempt(form, lambda: add_along(user=person(request), well=at_hand, kind=kind, values=values))
        if made is not None:
            messages.success(request, f"Recorded: {made}.")
            return redirect("well_edit", slug, pk)
    return render(request, "wells/well_edit.html", _desk(at_hand, WellForm(instance=at_hand), kind, form))


@require_POST
def well_remove(request: HttpRequest, slug: str, pk: int, kind: str, thing: int) -> HttpResponse:
    """Take out what was recorded by mistake."""
    project = open_project(request, slug, Action.REGISTER)
    at_hand = find(of_project(request, project), "well", pk=pk)
    remove_along(user=person(request), well=at_hand, kind=kind, pk=thing, reason=request.POST.get("reason", ""))
    messages.success(request, "Taken out. The audit trail keeps what it was.")
    return redirect("well_edit", slug, pk)
