"""Who may do what. The one place that knows roles: pages, API and commands all ask here.

Deny by default: every queryset that answers a request starts from ``visible_projects`` or ``visible``, and every
change begins with ``require``. A project without membership does not exist for that user.
"""

from enum import StrEnum
from typing import Any, TypeVar

from django.contrib.auth.models import AbstractBaseUser, AnonymousUser, User
from django.db.models import Model, QuerySet

from labdata.errors import NotAllowed, NotFound
from labdata.models import Membership, Project, Role


class Action(StrEnum):
    """What a member may want to do."""

    VIEW = "view"
    PULL = "pull"
    UPLOAD = "upload"
    REGISTER = "register"
    RUN_QC = "run_qc"
    DECIDE = "decide"
    SIGN = "sign"
    REOPEN = "reopen"
    RELEASE = "release"
    WITHDRAW = "withdraw"
    EDIT_RULES = "edit_rules"
    READ_AUDIT = "read_audit"
    ADMINISTER = "administer"


_EVERYONE = {Action.VIEW, Action.PULL}
GRANTS: dict[Role, set[Action]] = {
    Role.COORDINATOR: _EVERYONE | {Action.UPLOAD, Action.REGISTER, Action.RUN_QC},
    Role.ANALYST: _EVERYONE | {Action.UPLOAD, Action.RUN_QC},
    Role.GEOCHEMIST: _EVERYONE | {Action.RUN_QC, Action.DECIDE, Action.EDIT_RULES, Action.READ_AUDIT},
    Role.APPROVER: _EVERYONE | {Action.SIGN, Action.REOPEN, Action.RELEASE, Action.WITHDRAW, Action.READ_AUDIT},
    Role.INTERPRETER: _EVERYONE,
    Role.ADMINISTRATOR: _EVERYONE | {Action.ADMINISTER, Action.EDIT_RULES, Action.READ_AUDIT},
}

AnyUser = AbstractBaseUser | AnonymousUser
M = TypeVar("M", bound=Model)


def visible_projects(user: AnyUser) -> QuerySet[Project]:
    """Projects in which the user has any role."""
    if not user.is_authenticated or not user.is_active:
        return Project.objects.none()
    return Project.objects.filter(pk__in=Membership.objects.filter(user_id=user.pk).values("project"))


def visible(user: AnyUser, queryset: QuerySet[M], path: str = "project") -> QuerySet[M]:
    """``queryset`` cut to the user's projects; ``path`` leads from a row to its project."""
    return queryset.filter(**{f"{path}__in": visible_projects(user)})


def roles(user: AnyUser, project: Project) -> set[Role]:
    """The user's roles in the project."""
    if not user.is_authenticated or not user.is_active:
        return set()
    held = Membership.objects.filter(user_id=user.pk, project=project).values_list("role", flat=True)
    return {Role(role) for role in held}


def actions(user: AnyUser, project: Project) -> set[Action]:
    """Everything the user may do in the project."""
    return set().union(*(GRANTS[role] for role in roles(user, project)))


def allowed(user: AnyUser, project: Project, action: Action) -> bool:
    return action in actions(user, project)


def require(user: AnyUser, project: Project, action: Action) -> None:
    """Raises NotFound for a stranger to the project, NotAllowed for a member without the right."""
    granted = actions(user, project)
    if not granted:
        raise NotFound(f"There is no project «{project.slug}».", remedy="Ask its administrator for a membership.")
    if action not in granted:
        able = ", ".join(role.label for role in Role if action in GRANTS[role])
        raise NotAllowed(
            f"{user} may not {action.replace('_', ' ')} in project «{project.slug}».",
            remedy=f"Roles that may: {able}.",
            action=str(action),
        )


def find_project(slug: str) -> Project:
    """The project by its slug, for commands. Raises NotFound."""
    try:
        return Project.objects.get(slug=slug)
    except Project.DoesNotExist:
        known = ", ".join(Project.objects.values_list("slug", flat=True)) or "none yet"
        raise NotFound(f"There is no project «{slug}».", remedy=f"Projects: {known}.", project=slug) from None


def find_user(name: str) -> User:
    """The active account by its name, for commands. Raises NotFound."""
    user = User.objects.filter(username=name, is_active=True).first()
    if user is None:
        raise NotFound(f"There is no account «{name}».", remedy="Name an account that may sign in.", user=name)
    return user


def describe(user: AnyUser, project: Project) -> dict[str, Any]:
    """What templates show of the user's standing in the project."""
    return {
        "roles": sorted(role.label for role in roles(user, project)),
        "may": {str(a) for a in actions(user, project)},
    }
