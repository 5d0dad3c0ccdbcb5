"""The work list of the room: which set waits for whom, how old, how many flags of which weight."""

from collections import defaultdict
from dataclasses import dataclass, field

from django.contrib.auth.models import User
from django.db.models import Count, OuterRef, Subquery

from labdata.access import Action, actions
from labdata.models import Project, Result
from qc.models import Decision, Flag, ReviewSet, SignOff, Verdict


@dataclass
class Line:
    """One review set of the work list."""

    review_set: ReviewSet
    counts: dict[str, int]
    flags: dict[str, int] = field(default_factory=dict)
    signature: SignOff | None = None
    deciders: list[str] = field(default_factory=list)
    waits_for: str = ""
    for_me: bool = False

    @property
    def results(self) -> int:
        return sum(self.counts.values())

    @property
    def open_results(self) -> int:
        return self.counts[Verdict.UNDECIDED] + self.counts[Verdict.HELD]

    @property
    def blocked(self) -> str:
        """What keeps an undecided set from being signed, in words."""
        left = [f"{self.counts[v]} {v}" for v in (Verdict.UNDECIDED, Verdict.HELD) if self.counts[v]]
        return " and ".join(left)


def work_list(project: Project, user: User) -> list[Line]:
    """Every set of the project, the user's own work first, then by age."""
    sets = list(ReviewSet.objects.filter(project=project).select_related("well"))
    counts, flags = _verdicts(project), _flags(project)
    signatures = {s.review_set_id: s for s in SignOff.objects.filter(review_set__project=project, reopening=None)}
    deciders = _deciders(project)
    may = actions(user, project)
    lines = [
        Line(one, counts[one.pk], flags.get(one.pk, {}), signatures.get(one.pk), deciders[one.pk]) for one in sets
    ]  # fmt: skip
    for line in lines:
        line.waits_for, line.for_me = _waits_for(line, user, may)
    return sorted(lines, key=lambda line: (not line.for_me, bool(line.signature), line.review_set.created_at))


def _waits_for(line: Line, user: User, may: set[Action]) -> tuple[str, bool]:
    """Whom the set waits for, and whether this user can take it up."""
    if line.signature:
        return "nobody: it is signed", False
    if not line.results:
        return "results", False
    if line.open_results:
        return "a geochemist", Action.DECIDE in may
    if user.get_username() in line.deciders:
        return "an approver other than who decided", False
    return "an approver", Action.SIGN in may


def _verdicts(project: Project) -> dict[int, dict[str, int]]:
    """Results per set and standing verdict, in one query."""
    latest = Decision.objects.filter(result=OuterRef("pk")).order_by("-pk").values("verdict")[:1]
    current = Result.objects.filter(
        current=True, analysis__current=True, analysis__review_item__review_set__project=project
    )
    rows = (
        current.annotate(stands=Subquery(latest))
        .values_list("analysis__review_item__review_set", "stands")
        .annotate(n=Count("pk"))
        .order_by()
    )
    counts: dict[int, dict[str, int]] = defaultdict(lambda: dict.fromkeys(Verdict.values, 0))
    for review_set, verdict, n in rows:
        counts[review_set][verdict or Verdict.UNDECIDED] += n
    return counts


def _flags(project: Project) -> dict[int, dict[str, int]]:
    """Flags of the latest runs per set and severity."""
    latest = Flag.objects.in_force().filter(well__project=project).order_by()
    own = latest.filter(analysis__current=True).values_list("analysis__review_item__review_set", "severity")
    of_unit = latest.filter(analysis=None).values_list("well__review_sets", "severity")
    counts: dict[int, dict[str, int]] = defaultdict(lambda: defaultdict(int))
    for review_set, severity, n in [*own.annotate(Count("pk")), *of_unit.annotate(Count("pk"))]:
        if review_set is not None:
            counts[review_set][severity] += n
    return {pk: dict(found) for pk, found in counts.items()}


def _deciders(project: Project) -> dict[int, list[str]]:
    """Who decided in each set."""
    rows = Decision.objects.filter(review_set__project=project).order_by("decided_by__username")
    people: dict[int, list[str]] = defaultdict(list)
    for review_set, name in rows.values_list("review_set", "decided_by__username").distinct():
        people[review_set].append(name)
    return people
