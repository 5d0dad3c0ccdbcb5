"""Who calls, and what they may see: the user's projects, cut to the token's one project when a token came along."""

from dataclasses import dataclass
from typing import TypeVar

from django.contrib.auth.models import User
from django.db.models import Model, QuerySet
from rest_framework.request import Request

from labdata.access import GRANTS, Action, require, visible_projects
from labdata.errors import NotAllowed, NotFound
from labdata.models import ApiToken, Membership, Project, Role

M = TypeVar("M", bound=Model)


@dataclass(frozen=True)
class Caller:
    """Every queryset of the API starts from here."""

    user: User
    projects: QuerySet[Project]

    def visible(self, queryset: QuerySet[M], path: str = "project") -> QuerySet[M]:
        """``queryset`` cut to the caller's projects; ``path`` leads from a row to its project."""
        return queryset.filter(**{f"{path}__in": self.projects})

    def project(self, slug: str) -> Project:
        """A project by its slug. Raises NotFound for one that may not be seen, as for one that is not there."""
        found = self.projects.filter(slug=slug).first()
        if found is None:
            raise NotFound(f"There is no project «{slug}».", remedy="Name one of GET /api/v1/projects.", project=slug)
        return found

    def find(self, queryset: QuerySet[M], pk: int, what: str, path: str = "project") -> M:
        """One visible row by its id. Raises NotFound."""
        found = self.visible(queryset, path).filter(pk=pk).first()
        if found is None:
            raise NotFound(f"There is no {what} {pk}.", remedy=f"Look it up in the list of {what}s.")
        return found

    def permitted(self, action: Action) -> QuerySet[Project]:
        """The visible projects in which the caller may do ``action``. Raises NotAllowed when there is none."""
        granting = [role for role in Role if action in GRANTS[role]]
        held = Membership.objects.filter(user=self.user, role__in=granting)
        projects = self.projects.filter(pk__in=held.values("project"))
        if not projects.exists():
            raise NotAllowed(
                f"{self.user} may not {action.replace('_', ' ')} in any project.",
                remedy=f"Roles that may: {', '.join(role.label for role in granting)}.",
            )
        return projects

    def require(self, project: Project, action: Action) -> None:
        """Raises NotFound or NotAllowed (labdata.access.require), before anything is read from a request's body."""
        self.project(project.slug)
        require(self.user, project, action)


def caller_of(request: Request) -> Caller:
    """The caller behind an authenticated request."""
    user = request.user
    if not isinstance(user, User):  # the permission has turned anonymous callers away
        raise NotAllowed("Sign in, or send «Authorization: Token KEY».")
    projects = visible_projects(user)
    if isinstance(request.auth, ApiToken):
        projects = projects.filter(pk=request.auth.project_id)
    return Caller(user, projects)
