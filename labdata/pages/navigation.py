"""The rooms of a project as the pages show them, and which one an address belongs to."""

from dataclasses import dataclass

from django.urls import reverse

from labdata.access import Action
from labdata.models import Project


@dataclass(frozen=True)
class Room:
    """One entry of the navigation."""

    label: str
    url: str
    current: bool


#: label, URL name, the right that shows it, first words of the URL names that belong to it
ROOMS: tuple[tuple[str, str, Action, tuple[str, ...]], ...] = (
    ("Project", "project", Action.VIEW, ("project", "job", "jobs")),
    ("Wells", "wells", Action.VIEW, ("wells", "well", "sample", "result", "custody")),
    ("Uploads", "uploads", Action.VIEW, ("uploads", "upload")),
    ("QC", "qc_runs", Action.VIEW, ("qc", "rules", "rule", "rehearse")),
    ("Review", "review_sets", Action.VIEW, ("review",)),
    ("Releases", "releases", Action.VIEW, ("releases", "release")),
    ("Audit", "audit", Action.READ_AUDIT, ("audit",)),
    ("Members", "members", Action.ADMINISTER, ("members", "member")),
)


def rooms(url_name: str, project: Project | None, may: set[str]) -> list[Room]:
    """The navigation for someone who may do ``may`` in ``project``, at the page ``url_name``."""
    found = [Room("Work", reverse("home"), url_name == "home")]
    if project is None:
        return found
    first = url_name.split("_", maxsplit=1)[0]
    for label, name, action, words in ROOMS:
        if action in may:
            found.append(Room(label, reverse(name, args=[project.slug]), first in words and url_name != "project_new"))
    return found
