"""What every page needs: the user's projects, the project at hand and what may be done in it."""

from datetime import timedelta
from typing import Any

from django.http import HttpRequest
from django.utils import timezone

from labdata.access import describe, visible_projects
from labdata.models import SweeperBeat
from labdata.pages.navigation import rooms
from labdata.projects import may_open_project

SILENCE = timedelta(seconds=60)


def workplace(request: HttpRequest) -> dict[str, Any]:
    """Template context: ``projects``, ``rooms``, ``may`` (action strings), ``worker_silent``, ``may_open_project``;
    ``project`` and ``roles`` where the URL names a project.
    """
    user = getattr(request, "user", None)
    if user is None or not user.is_authenticated:
        return {"may": set()}
    projects = list(visible_projects(user))
    match = request.resolver_match
    slug = match.kwargs.get("slug") if match else None
    project = next((candidate for candidate in projects if candidate.slug == slug), None)
    standing = describe(user, project) if project else {"roles": [], "may": set()}
    return {
        "projects": projects,
        "project": project,
        **standing,
        "rooms": rooms((match.url_name or "") if match else "", project, standing["may"]),
        "may_open_project": may_open_project(user),
        "worker_silent": worker_silent(),
    }


def worker_silent() -> bool:
    """True when no worker has swept for a minute."""
    return not SweeperBeat.objects.filter(at__gt=timezone.now() - SILENCE).exists()
