"""The project's part of the audit trail, and whether the whole chain holds."""

from django import forms
from django.db.models import Q, QuerySet
from django.http import HttpRequest, HttpResponse
from django.shortcuts import render
from django.views.decorators.http import require_safe

from labdata.access import Action, visible
from labdata.audit import verify
from labdata.errors import AuditBroken
from labdata.models import AuditEntry
from labdata.pages.common import open_project, page_of


class AuditFilter(forms.Form):
    """What to look for."""

    q = forms.CharField(label="Person, action, thing or reason", required=False, max_length=100)
    since = forms.DateField(label="From", required=False, widget=forms.DateInput(attrs={"type": "date"}))
    until = forms.DateField(label="Until", required=False, widget=forms.DateInput(attrs={"type": "date"}))


@require_safe
def audit(request: HttpRequest, slug: str) -> HttpResponse:
    """Entries, newest first. The chain runs over all projects; ``?verify=1`` walks it."""
    project = open_project(request, slug, Action.READ_AUDIT)
    form = AuditFilter(request.GET)
    rows = visible(request.user, AuditEntry.objects.filter(project=project)).order_by("-seq")
    if form.is_valid():
        rows = _filtered(rows, form)
    chain, broken = _chain() if request.GET.get("verify") else (None, None)
    context = {"form": form, "page": page_of(request, rows), "chain": chain, "broken": broken}
    return render(request, "audit/audit.html", context)


def _filtered(rows: QuerySet[AuditEntry], form: AuditFilter) -> QuerySet[AuditEntry]:
    asked = form.cleaned_data
    if word := asked["q"]:
        fits = Q(actor_name__icontains=word) | Q(action__icontains=word) | Q(reason__icontains=word)
        rows = rows.filter(fits | Q(object_type__icontains=word) | Q(object_id=word))
    if asked["since"]:
        rows = rows.filter(at__date__gte=asked["since"])
    if asked["until"]:
        rows = rows.filter(at__date__lte=asked["until"])
    return rows


def _chain() -> tuple[dict[str, object] | None, AuditBroken | None]:
    try:
        return verify(), None
    except AuditBroken as found:
        return None, found
