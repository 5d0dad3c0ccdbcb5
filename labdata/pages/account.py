"""Signing in and out, and the account's own password."""

from typing import Any

from django.contrib.auth import views as auth
from django.contrib.auth.forms import AuthenticationForm
from django.contrib.messages.views import SuccessMessageMixin
from django.core.exceptions import ValidationError
from django.urls import reverse_lazy

from labdata.logins import TooManyTries, check_not_locked, forget_failures, note_failure


class SignInForm(AuthenticationForm):
    """Account and password, behind the throttle."""

    error_messages = {
        "invalid_login": "Account and password do not match. Both mind capital letters.",
        "inactive": "This account is closed.",
    }

    def __init__(self, *args: Any, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.fields["username"].label = "Account name"

    def clean(self) -> dict[str, Any]:
        account = self.cleaned_data.get("username") or ""
        address = self.request.META.get("REMOTE_ADDR", "") if self.request else ""
        try:
            check_not_locked(account, address)
        except TooManyTries as refusal:
            raise ValidationError(str(refusal), code=refusal.code) from refusal
        try:
            cleaned = super().clean()
        except ValidationError:
            note_failure(account, address)
            raise
        forget_failures(account, address)
        return cleaned


class SignIn(auth.LoginView):
    authentication_form = SignInForm


class ChangePassword(SuccessMessageMixin, auth.PasswordChangeView):
    success_url = reverse_lazy("home")
    success_message = "Your password is changed."
