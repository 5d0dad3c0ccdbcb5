"""What waits for whom: the work list of one user in one project, by the user's rights."""

from collections import defaultdict
from dataclasses import dataclass
from datetime import datetime

from django.contrib.auth.models import User
from django.db.models import Count, Max, Min, OuterRef, Q, QuerySet, Subquery
from django.urls import NoReverseMatch, reverse

from labdata.access import Action, actions
from labdata.models import Job, JobState, Project, Result, Upload
from qc.models import Decision, Flag, ReviewSet, ReviewSetState, SignOff, Verdict

UNREAD = (Upload.Outcome.REFUSED, Upload.Outcome.FAILED)


@dataclass(frozen=True)
class Waiting:
    """One kind of work: how much of it, since when, and where it is done."""

    what: str
    count: int
    oldest: datetime | None
    url: str
    note: str = ""


@dataclass(frozen=True)
class SetProgress:
    """How far a review set is."""

    review_set: ReviewSet
    results: int
    undecided: int
    held: int

    @property
    def decided(self) -> int:
        return self.results - self.undecided - self.held

    @property
    def ready(self) -> bool:
        """Nothing is left to decide."""
        return self.results > 0 and self.undecided == 0 and self.held == 0


def waiting_for(user: User, project: Project) -> list[Waiting]:
    """Everything in ``project`` that ``user`` could take up now, in the order data walks."""
    may = actions(user, project)
    found: list[Waiting] = []
    if Action.UPLOAD in may:
        found += _uploads(project)
    if may & {Action.DECIDE, Action.SIGN}:
        found += _sets(user, project, may)
    if Action.RELEASE in may:
        found += _releasable(project)
    if may & {Action.UPLOAD, Action.RUN_QC}:
        found += _failed_jobs(user, project)
    return [waiting for waiting in found if waiting.count]


def _uploads(project: Project) -> list[Waiting]:
    waiting = Upload.objects.filter(project=project, outcome=Upload.Outcome.WAITING)
    count, oldest = _count_oldest(waiting)
    address = reverse("uploads", args=[project.slug])
    return [Waiting("files with questions to answer", count, oldest, f"{address}?outcome=waiting")]


def _sets(user: User, project: Project, may: set[Action]) -> list[Waiting]:
    """Sets to review, and sets to sign; a set in which the user decided is for someone else to sign."""
    open_sets = progress(ReviewSet.objects.filter(project=project, state=ReviewSetState.OPEN))
    to_review = [one for one in open_sets if one.results and not one.ready]
    ready = [one for one in open_sets if one.ready]
    own = set(
        Decision.objects.filter(decided_by=user, review_set__project=project).values_list("review_set", flat=True)
    )
    to_sign = [one for one in ready if one.review_set.pk not in own]
    address = _address("review_sets", project)
    found = []
    if Action.DECIDE in may:
        undecided = sum(one.undecided + one.held for one in to_review)
        found.append(_of_sets("review sets to decide", to_review, address, f"{undecided} results open"))
    if Action.SIGN in may:
        blocked = len(ready) - len(to_sign)
        note = f"{blocked} more need another signer: you decided in them" if blocked else ""
        found.append(_of_sets("review sets to sign", to_sign, address, note))
    return found


def _address(name: str, project: Project) -> str:
    try:
        return reverse(name, args=[project.slug])
    except NoReverseMatch:
        return ""


def _of_sets(what: str, sets: list[SetProgress], url: str, note: str) -> Waiting:
    return Waiting(what, len(sets), min((one.review_set.created_at for one in sets), default=None), url, note)


def _releasable(project: Project) -> list[Waiting]:
    signed = SignOff.objects.filter(review_set__project=project, reopening__isnull=True, releases__isnull=True)
    count, oldest = _count_oldest(signed, "signed_at")
    return [Waiting("signed sets not in a release yet", count, oldest, reverse("releases", args=[project.slug]))]


def _failed_jobs(user: User, project: Project) -> list[Waiting]:
    """The user's own jobs that failed and have not been followed by one of the kind that worked."""
    jobs = Job.objects.filter(project=project, created_by=user)
    last = dict(jobs.filter(state=JobState.SUCCEEDED).values_list("kind").annotate(Max("created_at")))
    failed = jobs.filter(state=JobState.FAILED).order_by("created_at").values_list("kind", "created_at")
    open_since = [at for kind, at in failed if kind not in last or at > last[kind]]
    address = f"{reverse('jobs', args=[project.slug])}?state=failed"
    return [Waiting("of your jobs that failed", len(open_since), min(open_since, default=None), address)]


def _count_oldest(rows: QuerySet, field: str = "created_at") -> tuple[int, datetime | None]:  # type: ignore[type-arg]
    found = rows.aggregate(count=Count("pk"), oldest=Min(field))
    return found["count"], found["oldest"]


def progress(sets: QuerySet[ReviewSet]) -> list[SetProgress]:
    """How far each set is, in two queries however many sets there are."""
    sets_by_id = {one.pk: one for one in sets.select_related("well")}
    latest = Decision.objects.filter(result=OuterRef("pk")).order_by("-pk").values("verdict")[:1]
    rows = (
        Result.objects.filter(current=True, analysis__current=True, analysis__review_item__review_set__in=sets_by_id)
        .annotate(verdict=Subquery(latest))
        .values_list("analysis__review_item__review_set", "verdict")
        .annotate(n=Count("pk"))
        .order_by()
    )
    counts: dict[int, dict[str, int]] = defaultdict(lambda: defaultdict(int))
    for pk, verdict, n in rows:
        counts[pk][verdict or Verdict.UNDECIDED] += n
    return [
        SetProgress(one, sum(counts[pk].values()), counts[pk][Verdict.UNDECIDED], counts[pk][Verdict.HELD])
        for pk, one in sets_by_id.items()
    ]


def flag_counts(project: Project, **lookup: object) -> dict[str, int]:
    """Flags of the latest runs by severity."""
    flags = Flag.objects.latest().filter(well__project=project, **lookup)
    return dict(flags.order_by().values_list("severity").annotate(Count("pk")))


def unread(project: Project) -> int:
    """Uploads that were refused or failed."""
    return Upload.objects.filter(Q(project=project) & Q(outcome__in=UNREAD)).count()
