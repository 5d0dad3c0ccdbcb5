"""The same review without scripts: a table with boxes to tick, and one form to decide on them."""

from typing import cast

from django import forms
from django.contrib import messages
from django.contrib.auth.models import User
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.views.decorators.http import require_http_methods

from labdata.access import Action, allowed
from labdata.errors import InvalidInput, KerogateError
from labdata.pages.common import page_of
from qc.models import ReasonCode, Verdict
from qc.review import services
from qc.review.requests import find_set
from qc.review.standing import flagged_results, results_of, standing, valid_signature, verdict_counts

PAGE_SIZE = 200
VERDICT_WORDS = [
    (Verdict.ACCEPTED.value, "accept"), (Verdict.REJECTED.value, "reject"), (Verdict.HELD.value, "hold"),
]  # fmt: skip


class PlainForm(forms.Form):
    """A verdict over the ticked results."""

    verdict = forms.ChoiceField(choices=VERDICT_WORDS, widget=forms.RadioSelect)
    reason = forms.ChoiceField(
        choices=[(code.value, code.label) for code in ReasonCode], required=False,
        help_text="A rejection and a hold need one.",
    )  # fmt: skip
    text = forms.CharField(label="In words", required=False, max_length=2000)
    version = forms.IntegerField(widget=forms.HiddenInput)


@require_http_methods(["GET", "POST"])
def review_plain(request: HttpRequest, slug: str, pk: int) -> HttpResponse:
    """Results a row each, a page of two hundred, undecided and flagged first where asked (?state=)."""
    review_set = find_set(request, slug, pk)
    form = PlainForm(request.POST or None, initial={"version": review_set.version, "verdict": "accepted"})
    if request.method == "POST" and form.is_valid():
        try:
            _apply(request, form, cast(User, request.user))
            return redirect(request.get_full_path())
        except KerogateError as refusal:
            form = _refused(request, find_set(request, slug, pk).version, refusal)
    results = results_of(review_set).select_related("analyte", "analysis__sample", "analysis__method")
    page = page_of(
        request, results.order_by("analysis__sample__top_md_m", "analysis", "analyte__order", "pk"), PAGE_SIZE
    )
    rows = list(page.object_list)
    decided, flagged = standing(results_of(review_set)), flagged_results(review_set)
    context = {
        "review_set": review_set, "form": form, "page": page, "counts": verdict_counts(review_set),
        "may_decide": allowed(request.user, review_set.project, Action.DECIDE) and not valid_signature(review_set),
        "signature": valid_signature(review_set),
        "rows": [(row, decided.get(row.pk), row.pk in flagged) for row in rows],
    }  # fmt: skip
    return render(request, "review/review_plain.html", context)


def _refused(request: HttpRequest, version: int, refusal: KerogateError) -> PlainForm:
    """The form as it was filled in, with the refusal; it now speaks of the set as the page shows it again."""
    given = request.POST.copy()
    given["version"] = str(version)
    form = PlainForm(given)
    form.is_valid()
    form.add_error(None, str(refusal))
    return form


def _apply(request: HttpRequest, form: PlainForm, user: User) -> None:
    """Decide on the ticked results. Raises what ``decide`` raises."""
    kwargs = request.resolver_match.kwargs if request.resolver_match else {}
    review_set = find_set(request, kwargs["slug"], kwargs["pk"])
    ticked = request.POST.getlist("result")
    if not all(pk.isdigit() for pk in ticked):
        raise InvalidInput("A ticked result is no number.", remedy="Load the page again.")
    given = form.cleaned_data
    chosen = [services.Choice(int(pk), given["verdict"], given["reason"], given["text"]) for pk in ticked]
    services.decide(user=user, review_set=review_set, choices=chosen, expected_version=given["version"])
    messages.success(request, f"{len(chosen)} results {given['verdict']}.")
