"""Members of a project: their roles, and accounts for new people."""

from django import forms
from django.contrib import messages
from django.http import HttpRequest, HttpResponse
from django.shortcuts import redirect, render
from django.views.decorators.http import require_http_methods, require_POST

from labdata.access import GRANTS, Action, visible
from labdata.members import add_role, create_account, remove_role, set_password
from labdata.models import Membership, Project, Role
from labdata.pages.common import attempt, open_project, person

#: What each role is there for, beside what access.py lets it do.
DUTIES = {
    Role.COORDINATOR: "brings files in, looks after wells and samples",
    Role.ANALYST: "brings in the laboratory's own files and answers questions on them",
    Role.GEOCHEMIST: "reviews results and decides on them, sets thresholds",
    Role.APPROVER: "signs what others decided, makes and withdraws releases",
    Role.INTERPRETER: "reads, and pulls releases",
    Role.ADMINISTRATOR: "gives roles and makes accounts",
}


class RoleForm(forms.Form):
    """A role for an account that exists."""

    username = forms.CharField(label="Account name", max_length=150)
    role = forms.ChoiceField(choices=Role.choices)


class AccountForm(forms.Form):
    """A new account with its first role."""

    username = forms.CharField(label="Account name", max_length=150, help_text="Letters, digits and @ . + - _")
    first_name = forms.CharField(max_length=150, required=False)
    last_name = forms.CharField(max_length=150, required=False)
    role = forms.ChoiceField(choices=Role.choices)
    password = forms.CharField(
        label="First password", strip=False, widget=forms.PasswordInput(attrs={"autocomplete": "new-password"}),
        help_text="At least ten characters. Hand it over in person; it can be changed after signing in.",
    )  # fmt: skip


class PasswordForm(forms.Form):
    """A new password for a member who has lost theirs."""

    username = forms.CharField(label="Account name", max_length=150)
    password = forms.CharField(
        label="New password", strip=False, widget=forms.PasswordInput(attrs={"autocomplete": "new-password"}),
        help_text="Hand it over in person. It is for members of your own projects only.",
    )  # fmt: skip


@require_http_methods(["GET", "POST"])
def members(request: HttpRequest, slug: str) -> HttpResponse:
    """Who has which role; the form that adds a role to an account."""
    project = open_project(request, slug, Action.ADMINISTER)
    form = RoleForm(request.POST or None, prefix="role")
    if request.method == "POST" and form.is_valid():
        asked = form.cleaned_data
        added = attempt(form, lambda: add_role(by=person(request), project=project, **asked))
        if added:
            messages.success(request, f"{added.user} is now {added.get_role_display()}.")
            return redirect("members", slug)
    return _page(request, project, role_form=form)


@require_POST
def member_create(request: HttpRequest, slug: str) -> HttpResponse:
    """Make an account and give it its first role."""
    project = open_project(request, slug, Action.ADMINISTER)
    form = AccountForm(request.POST, prefix="account")
    if form.is_valid():
        asked = form.cleaned_data
        made = attempt(form, lambda: create_account(by=person(request), project=project, **asked))
        if made:
            messages.success(request, f"The account {made.username} is made. Hand over its password in person.")
            return redirect("members", slug)
    return _page(request, project, account_form=form)


@require_POST
def member_password(request: HttpRequest, slug: str) -> HttpResponse:
    """Set a member's password anew."""
    project = open_project(request, slug, Action.ADMINISTER)
    form = PasswordForm(request.POST, prefix="password")
    if form.is_valid():
        asked = form.cleaned_data
        attempt(form, lambda: set_password(by=person(request), project=project, **asked))
    if form.is_valid():
        messages.success(request, f"{form.cleaned_data['username']} has a new password.")
        return redirect("members", slug)
    return _page(request, project, password_form=form)


@require_POST
def member_remove(request: HttpRequest, slug: str) -> HttpResponse:
    """Take a role away."""
    project = open_project(request, slug, Action.ADMINISTER)
    username, role = request.POST.get("username", ""), request.POST.get("role", "")
    remove_role(by=person(request), project=project, username=username, role=role)
    messages.success(request, f"{username} no longer has the role «{role}».")
    return redirect("members", slug)


def _page(request: HttpRequest, project: Project, **sent: forms.Form) -> HttpResponse:
    """The page with its three forms, of which the one that was sent and refused shows why."""
    rows = visible(request.user, Membership.objects.filter(project=project)).select_related("user")
    roles = [(role.label, DUTIES[role], sorted(a.replace("_", " ") for a in GRANTS[role])) for role in Role]
    fresh = {
        "role_form": RoleForm(prefix="role"),
        "account_form": AccountForm(prefix="account"),
        "password_form": PasswordForm(prefix="password"),
    }
    context = {"memberships": rows.order_by("user__username", "role"), "all_roles": roles, **fresh, **sent}
    return render(request, "members/members.html", context)
