"""What every page needs: the user's projects, the project at hand and what may be done in it."""

from typing import Any

from django.http import HttpRequest

from labdata.access import describe, visible_projects


def workplace(request: HttpRequest) -> dict[str, Any]:
    """Template context: ``projects``, and ``project``, ``roles``, ``may`` where the URL names a project."""
    user = getattr(request, "user", None)
    if user is None or not user.is_authenticated:
        return {}
    projects = list(visible_projects(user))
    slug = request.resolver_match.kwargs.get("slug") if request.resolver_match else None
    project = next((candidate for candidate in projects if candidate.slug == slug), None)
    return {"projects": projects, "project": project, **(describe(user, project) if project else {"may": set()})}
