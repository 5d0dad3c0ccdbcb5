"""The rehearsal: what the project's QC would catch, and the button that tries it."""

from typing import Any

from django import forms
from django.contrib import messages
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.views.decorators.http import require_http_methods

from labdata.access import Action
from labdata.pages.common import open_project, person
from qc.rehearsal.faults import KINDS
from qc.rehearsal.services import SEED, last_rehearsal, start_rehearsal, waiting_rehearsal


class RehearsalForm(forms.Form):
    """The seed: the same one injects the same faults."""

    seed = forms.IntegerField(
        min_value=0,
        max_value=2**31 - 1,
        initial=SEED,
        help_text="The same number injects the same faults into the same results.",
    )


@require_http_methods(["GET", "POST"])
def rehearse(request: HttpRequest, slug: str) -> HttpResponse:
    """The last rehearsal; a POST asks for a new one."""
    project = open_project(request, slug, Action.RUN_QC if request.method == "POST" else Action.VIEW)
    form = RehearsalForm(request.POST if request.method == "POST" else None)
    if request.method == "POST" and form.is_valid():
        job = start_rehearsal(project, person(request), seed=form.cleaned_data["seed"])
        messages.success(request, "The rehearsal is on its way; it takes a minute or two.")
        return redirect("job", slug, job.pk)
    last = last_rehearsal(project)
    context = {
        "form": form, "last": last, "told": last.result if last else None, "waiting": waiting_rehearsal(project),
        "rows": by_kind(last.result["kinds"]) if last else [], "kinds": KINDS,
    }  # fmt: skip
    return render(request, "qc/rehearse.html", context)


def by_kind(entries: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """One group a kind with its strengths, in the order of the answer."""
    groups: dict[str, dict[str, Any]] = {}
    for entry in entries:
        share = None if entry["rate"] is None else f"{100 * entry['rate']:.0f} %"
        group = groups.setdefault(entry["kind"], {"kind": entry["kind"], "title": entry["title"], "strengths": []})
        group["strengths"].append({**entry, "share": share, "rules": list(entry["rules"].items())})
    return list(groups.values())
