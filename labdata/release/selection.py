"""Which results a dataset holds, and as of when: what must be fixed so that it can be built again later."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any

from django.contrib.auth.models import User
from django.db.models import Max, QuerySet

from labdata.models import Project, Result, SurveyStation, Well
from qc.models import Decision, QcRunWell, ReviewSetState, SignOff

Range = tuple[int, int]


@dataclass(frozen=True)
class WellFacts:
    """What a row says of its well. ``survey``: stations (md [m], inclination, azimuth [degrees]), downward."""

    name: str
    uwi: str
    survey: Sequence[Sequence[float]] = ()


@dataclass(frozen=True)
class Signature:
    """The signature in force on a review set; decisions after ``last_decision`` came later."""

    sign_off: int
    signed_by: str
    signed_at: datetime
    last_decision: int


@dataclass(frozen=True)
class Selection:
    """Results of one project with everything about them that may change later.

    ``within`` are closed ranges of result ids (None: all of ``results``); ``signed_only`` counts decisions up to
    each signature, else the latest stands. ``qc_runs``: well -> the run whose flags count.
    """

    project: Project
    results: QuerySet[Result]
    wells: Mapping[int, WellFacts]
    signatures: Mapping[int, Signature]
    qc_runs: Mapping[int, int]
    people: Mapping[int, str]
    within: Sequence[Range] | None = None
    signed_only: bool = False
    extra: Mapping[str, Any] = field(default_factory=dict)


def signatures_in_force(project: Project) -> dict[int, Signature]:
    """Review set -> its valid signature with the last decision before it, of all signed sets of the project."""
    last = Decision.objects.filter(review_set__project=project).values("review_set").annotate(last=Max("pk"))
    return _signatures(project, dict(last.values_list("review_set", "last")))


def _signatures(project: Project, last: Mapping[int, int]) -> dict[int, Signature]:
    rows = SignOff.objects.filter(
        review_set__project=project, review_set__state=ReviewSetState.SIGNED, reopening__isnull=True
    ).order_by("pk")
    facts = rows.values_list("review_set_id", "pk", "signed_by__username", "signed_at")
    return {held: Signature(pk, who, when, last.get(held, 0)) for held, pk, who, when in facts}


def latest_runs(project: Project) -> dict[int, int]:
    """Well -> its latest QC run."""
    rows = QcRunWell.objects.filter(well__project=project).values("well").annotate(run=Max("run"))
    return dict(rows.values_list("well", "run"))


def well_facts(project: Project) -> dict[int, WellFacts]:
    """Every well of the project with its deviation survey."""
    stations: dict[int, list[list[float]]] = {}
    survey = SurveyStation.objects.filter(well__project=project).order_by("well", "md_m")
    for well, *station in survey.values_list("well_id", "md_m", "inclination_deg", "azimuth_deg"):
        stations.setdefault(well, []).append(station)
    rows = Well.objects.filter(project=project).order_by("pk").values_list("pk", "name", "uwi")
    return {pk: WellFacts(name, uwi, stations.get(pk, [])) for pk, name, uwi in rows}


def working_data(project: Project, results: QuerySet[Result] | None = None) -> Selection:
    """Today's data: current results (or those given) with the verdict that stands."""
    chosen = results
    if chosen is None:
        chosen = Result.objects.current().filter(analysis__project=project, analysis__current=True)
    return Selection(
        project=project,
        results=chosen,
        wells=well_facts(project),
        signatures=_signatures(project, {}),  # the latest decision stands, whichever it is
        qc_runs=latest_runs(project),
        people=dict(User.objects.values_list("pk", "username")),
    )


def as_ranges(ids: Sequence[int]) -> list[Range]:
    """Sorted ids as closed ranges: 1 2 3 7 is [(1, 3), (7, 7)]."""
    ranges: list[Range] = []
    for number in ids:
        if ranges and number == ranges[-1][1] + 1:
            ranges[-1] = (ranges[-1][0], number)
        else:
            ranges.append((number, number))
    return ranges
