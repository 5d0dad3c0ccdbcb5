"""The account's access tokens for programs."""

from django import forms
from django.contrib import messages
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.utils import timezone
from django.views.decorators.http import require_http_methods, require_POST

from labdata.access import visible_projects
from labdata.models import ApiToken, Project, TokenScope
from labdata.pages.common import attempt, find, person
from labdata.tokens import issue_token, revoke_token


class TokenForm(forms.Form):
    """What the new token is for."""

    project = forms.ModelChoiceField(queryset=Project.objects.none(), to_field_name="slug", empty_label=None)
    scope = forms.ChoiceField(
        choices=TokenScope.choices, help_text="Reading is enough to pull data. Your roles bound what either may do."
    )
    days = forms.IntegerField(
        label="Ends after days", min_value=1, max_value=3650, initial=90, required=False,
        help_text="Leave it empty for a token that lasts until it is revoked.",
    )  # fmt: skip

    def __init__(self, *args: object, projects: object, **kwargs: object) -> None:
        super().__init__(*args, **kwargs)  # type: ignore[arg-type]
        self.fields["project"].queryset = projects  # type: ignore[attr-defined]


@require_http_methods(["GET", "POST"])
def tokens(request: HttpRequest) -> HttpResponse:
    """The list and the form; a new key is shown in the answer to the form, and never again."""
    form = TokenForm(request.POST or None, projects=visible_projects(request.user))
    key = None
    if request.method == "POST" and form.is_valid():
        asked = form.cleaned_data
        key = attempt(form, lambda: issue_token(person(request), asked["project"], asked["scope"], asked["days"]))
    held = ApiToken.objects.filter(user=person(request), project__in=visible_projects(request.user))
    context = {"form": form, "key": key, "tokens": held.select_related("project"), "now": timezone.now()}
    return render(request, "account/tokens.html", context)


@require_POST
def token_revoke(request: HttpRequest, pk: int) -> HttpResponse:
    token = find(ApiToken.objects.filter(user=person(request)).select_related("project", "user"), "token", pk=pk)
    revoke_token(user=person(request), token=token)
    messages.success(request, "The token is revoked: programs that use it are turned away from now on.")
    return redirect("tokens")
