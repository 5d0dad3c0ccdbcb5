"""What waits for whom: the work list of one user in one project, by the user's rights."""

from dataclasses import dataclass
from datetime import datetime

from django.contrib.auth.models import User
from django.db.models import Count, Max, Min, QuerySet
from django.urls import reverse

from labdata.access import Action, actions
from labdata.models import Job, JobState, Project, Upload
from qc.models import Flag, SignOff
from qc.review.worklist import Line, work_list


@dataclass(frozen=True)
class Waiting:
    """One kind of work, in words for one and for several: how much of it, since when, and where it is done."""

    words: tuple[str, str]
    count: int
    oldest: datetime | None
    url: str
    note: str = ""

    @property
    def what(self) -> str:
        return self.words[self.count != 1]


def waiting_for(user: User, project: Project) -> list[Waiting]:
    """Everything in ``project`` that ``user`` could take up now, in the order data walks."""
    may = actions(user, project)
    found: list[Waiting] = []
    if Action.UPLOAD in may:
        found.append(_uploads(project))
    if may & {Action.DECIDE, Action.SIGN}:
        found += _sets(work_list(project, user), may, reverse("review_sets", args=[project.slug]))
    if Action.RELEASE in may:
        found.append(_releasable(project))
    if may & {Action.UPLOAD, Action.RUN_QC}:
        found.append(_failed_jobs(user, project))
    return [waiting for waiting in found if waiting.count]


def _uploads(project: Project) -> Waiting:
    waiting = Upload.objects.filter(project=project, outcome=Upload.Outcome.WAITING)
    count, oldest = _count_oldest(waiting, "created_at")
    address = f"{reverse('uploads', args=[project.slug])}?outcome=waiting"
    return Waiting(("file with questions to answer", "files with questions to answer"), count, oldest, address)


def _sets(lines: list[Line], may: set[Action], url: str) -> list[Waiting]:
    """Sets to decide and sets to sign; what the user decided is for someone else to sign."""
    unsigned = [line for line in lines if line.signature is None and line.results]
    undecided = [line for line in unsigned if line.open_results]
    ready = [line for line in unsigned if not line.open_results]
    to_sign = [line for line in ready if line.for_me]
    found = []
    if Action.DECIDE in may:
        note = f"{sum(line.open_results for line in undecided)} results undecided or held"
        found.append(_of_sets(("review set to decide", "review sets to decide"), undecided, url, note))
    if Action.SIGN in may:
        blocked = len(ready) - len(to_sign)
        note = f"{blocked} more: another approver signs what you decided" if blocked else ""
        found.append(_of_sets(("review set to sign", "review sets to sign"), to_sign, url, note))
    return found


def _of_sets(words: tuple[str, str], lines: list[Line], url: str, note: str) -> Waiting:
    oldest = min((line.review_set.created_at for line in lines), default=None)
    return Waiting(words, len(lines), oldest, url, note)


def _releasable(project: Project) -> Waiting:
    signed = SignOff.objects.filter(review_set__project=project, reopening__isnull=True, releases__isnull=True)
    count, oldest = _count_oldest(signed, "signed_at")
    words = ("signed set not in a release yet", "signed sets not in a release yet")
    return Waiting(words, count, oldest, reverse("releases", args=[project.slug]))


def _failed_jobs(user: User, project: Project) -> Waiting:
    """The user's own jobs that failed, unless a later one of their kind went well."""
    jobs = Job.objects.filter(project=project, created_by=user)
    went_well = jobs.filter(state=JobState.SUCCEEDED).order_by().values_list("kind").annotate(Max("created_at"))
    last = dict(went_well)
    failed = jobs.filter(state=JobState.FAILED).values_list("kind", "created_at")
    since = [at for kind, at in failed if kind not in last or at > last[kind]]
    address = f"{reverse('jobs', args=[project.slug])}?state=failed"
    return Waiting(("of your jobs failed", "of your jobs failed"), len(since), min(since, default=None), address)


def _count_oldest(rows: QuerySet, field: str) -> tuple[int, datetime | None]:  # type: ignore[type-arg]
    found = rows.aggregate(count=Count("pk"), oldest=Min(field))
    return found["count"], found["oldest"]


def flag_counts(project: Project) -> dict[str, int]:
    """Flags of the latest runs by severity."""
    flags = Flag.objects.in_force().filter(well__project=project)
    return dict(flags.order_by().values_list("severity").annotate(Count("pk")))
