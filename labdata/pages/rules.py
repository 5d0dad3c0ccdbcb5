"""Rules: what each tests and why, its thresholds in this project, and how versions of them differ."""

from typing import Any

from django import forms
from django.contrib import messages
from django.db.models import Count, F, Q, QuerySet
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.views.decorators.http import require_http_methods, require_safe

from labdata.access import Action, AnyUser, visible
from labdata.models import Project
from labdata.pages.common import attempt, find, open_project, page_of, person
from qc import explain
from qc.models import Flag, RuleSet
from qc.rehearsal.preview import preview
from qc.rulesets import effective_rule_set, new_version


class ThresholdForm(forms.Form):
    """The numbers of one rule, whether it is on, and why that changes."""

    enabled = forms.BooleanField(label="The rule runs in this project", required=False)

    def __init__(self, *args: Any, thresholds: list[dict[str, Any]], **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.thresholds = thresholds
        for one in thresholds:
            self.fields[one["name"]] = forms.FloatField(
                label=f"{one['label']} [{one['unit']}]" if one["unit"] else one["label"],
                initial=one["value"],
                widget=forms.NumberInput(attrs={"step": "any"}),
            )
        self.fields["reason"] = forms.CharField(
            max_length=300, help_text="Why the rule changes here; the version and the audit trail keep it."
        )

    def changes(self) -> dict[str, float]:
        """The thresholds whose number is another one now."""
        return {
            one["name"]: self.cleaned_data[one["name"]]
            for one in self.thresholds
            if self.cleaned_data[one["name"]] != one["value"]
        }


def versions(user: AnyUser, project: Project) -> QuerySet[RuleSet]:
    """The project's own versions, newest first, then those every project starts with."""
    own = visible(user, RuleSet.objects.filter(project=project)).values("pk")
    rows = RuleSet.objects.filter(Q(pk__in=own) | Q(project__isnull=True)).select_related("author", "project")
    return rows.order_by(F("project").asc(nulls_last=True), "-version")


@require_safe
def rules(request: HttpRequest, slug: str) -> HttpResponse:
    """Every rule in the order in which they run, with the flags that count now; the versions of the thresholds."""
    project = open_project(request, slug)
    in_force = effective_rule_set(project)
    flags = Flag.objects.in_force().filter(well__project=project).order_by()
    counts = dict(flags.values_list("rule").annotate(Count("pk")))
    listed = [{**one, "flags_now": counts.get(one["id"], 0)} for one in explain.catalogue(in_force)]
    context = {"rules": listed, "in_force": in_force, "versions": versions(request.user, project)}
    return render(request, "qc/rules.html", context)


@require_http_methods(["GET", "POST"])
def rule(request: HttpRequest, slug: str, rule_id: str) -> HttpResponse:
    """One rule in plain words; a geochemist changes its thresholds here, which makes a new version."""
    project = open_project(request, slug, Action.EDIT_RULES if request.method == "POST" else Action.VIEW)
    told = explain.explain(rule_id, effective_rule_set(project))
    form = ThresholdForm(
        request.POST or None, thresholds=told["thresholds"], initial={"enabled": told["enabled"]}, prefix="rule"
    )
    looked = None
    if request.method == "POST" and "preview" in request.POST:
        form.fields["reason"].required = False
        looked = attempt(form, lambda: _preview(project, told, form)) if form.is_valid() else None
    elif request.method == "POST" and form.is_valid():
        made = attempt(form, lambda: _change(request, project, told, form))
        if made:
            messages.success(request, f"Version {made.version} of the thresholds is in force from the next QC run.")
            return redirect("rule", slug, rule_id)
    flags = Flag.objects.in_force().filter(well__project=project, rule=rule_id)
    flags = flags.select_related("well", "analysis__sample", "analysis__method").order_by("well", "pk")
    context = {"rule": told, "form": form, "page": page_of(request, flags), "preview": looked}
    return render(request, "qc/rule.html", context)


def _preview(project: Project, told: dict[str, Any], form: ThresholdForm) -> dict[str, Any]:
    """What the numbers in the form would change on this project's data; nothing is kept."""
    changes = form.changes()
    return preview(project, {told["id"]: changes} if changes else {}, _switched_off(project, told, form))


def _switched_off(project: Project, told: dict[str, Any], form: ThresholdForm) -> set[str]:
    """Rules that do not run once the form is saved."""
    others = set(effective_rule_set(project).disabled) - {told["id"]}
    return others if form.cleaned_data["enabled"] else others | {told["id"]}


def _change(request: HttpRequest, project: Project, told: dict[str, Any], form: ThresholdForm) -> RuleSet | None:
    """The new version, or None with a word on the form when nothing would change."""
    enabled, changes = form.cleaned_data["enabled"], form.changes()
    if not changes and enabled == told["enabled"]:
        form.add_error(None, "Nothing changed: every number is as it was.")
        return None
    return new_version(
        project=project, changes={told["id"]: changes} if changes else {}, author=person(request),
        reason=form.cleaned_data["reason"], disabled=_switched_off(project, told, form),
    )  # fmt: skip


@require_safe
def rules_compare(request: HttpRequest, slug: str) -> HttpResponse:
    """Two versions side by side: every number that differs, and every rule switched on or off."""
    project = open_project(request, slug)
    known = versions(request.user, project)
    newest = effective_rule_set(project)
    older = _asked(request, known, "older") or known.filter(project__isnull=True).first() or newest
    newer = _asked(request, known, "newer") or newest
    context = {"versions": known, "older": older, "newer": newer, "differences": differences(older, newer)}
    return render(request, "qc/rules_compare.html", context)


def _asked(request: HttpRequest, known: QuerySet[RuleSet], name: str) -> RuleSet | None:
    asked = request.GET.get(name, "")
    return find(known, "version", pk=int(asked)) if asked.isdigit() else None


def differences(older: RuleSet, newer: RuleSet) -> list[dict[str, Any]]:
    """Rows of rule, what, before and after; in the order of rule and threshold names."""
    rows = []
    for rule_id in sorted({*older.thresholds, *newer.thresholds}):
        before, after = older.thresholds.get(rule_id, {}), newer.thresholds.get(rule_id, {})
        for name in sorted({*before, *after}):
            was, now = before.get(name, {}).get("value"), after.get(name, {}).get("value")
            if was != now:
                unit = (after.get(name) or before.get(name, {})).get("unit", "")
                rows.append(
                    {"rule": rule_id, "what": name.replace("_", " "), "before": was, "after": now, "unit": unit}
                )
    for rule_id in sorted({*older.disabled} ^ {*newer.disabled}):
        off = rule_id in newer.disabled
        rows.append(
            {"rule": rule_id, "what": "runs", "before": "yes" if off else "no", "after": "no" if off else "yes"}
        )
    return rows
