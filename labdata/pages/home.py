"""The start: every project of the user, and what waits there for them."""

from django.http import HttpRequest, HttpResponse
from django.shortcuts import render
from django.views.decorators.http import require_safe

from labdata.access import describe, visible_projects
from labdata.pages.common import person
from labdata.pages.work import flag_counts, waiting_for


@require_safe
def home(request: HttpRequest) -> HttpResponse:
    desks = [
        {
            "project": project,
            "roles": describe(request.user, project)["roles"],
            "waiting": waiting_for(person(request), project),
            "flags": flag_counts(project),
            "release": project.releases.filter(withdrawn_at__isnull=True).first(),
        }
        for project in visible_projects(request.user)
    ]
    return render(request, "home.html", {"desks": desks})
