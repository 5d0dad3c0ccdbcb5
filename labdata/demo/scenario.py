"""The walk of the demonstration through all rooms. A second walk over the same home continues where the first ended.

``show`` leaves work at every desk: one well released and re-opened by an amended report, one half reviewed, two
untouched, one file waiting for an answer, one refused. ``finish`` decides, signs and releases everything.
"""

from collections.abc import Callable
from dataclasses import dataclass

from django.contrib.auth.models import User

from labdata.demo import people, register, reviewing
from labdata.demo.basin import PROJECT_SLUG, TARROW_1, TARROW_2
from labdata.demo.workbooks import AMENDED, DemoFile, files
from labdata.errors import Conflict
from labdata.intake.services import receive
from labdata.jobs import run_all_here
from labdata.models import JobState, Project, Release, Upload
from labdata.release.selection import signatures_in_force
from labdata.release.services import build_release
from qc.models import ReviewSet, ReviewSetState
from qc.review.services import sign_off
from qc.review.standing import valid_signature

Say = Callable[[str], None]
FIRST_RELEASE = "Tarrow 1, first results"
LAST_RELEASE = "Quillane Basin, all wells"
HALFWAY_M = 1822.0  # Tarrow 2 is reviewed down to the base of the Corvane Shale


@dataclass(frozen=True)
class Stage:
    """The project with its people; ``password`` opens all accounts, ``made`` when it was made up just now."""

    project: Project
    users: dict[str, User]
    password: str
    made: bool
    say: Say


def set_stage(say: Say, *, must_sign: bool) -> Stage:
    """Project, accounts and wells, made where they are not there.

    A password from outside is set on all accounts. Without one, accounts that exist keep theirs, unless somebody
    must sign now: then all get a new random one.
    """
    password, given = people.chosen_password()
    known = User.objects.filter(username__in=[account for account, *_ in people.PEOPLE]).count()
    project = people.set_up_project()
    users = people.set_up_people(project, password, renew=given or must_sign)
    register.set_up_registry(project)
    register.set_up_rules(project, users["geochemist"])
    made = not given and (must_sign or known < len(people.PEOPLE))
    return Stage(project, users, password, made, say)


def to_do() -> bool:
    """Whether ``show`` has not yet come to its end in this home."""
    return not Upload.objects.filter(project__slug=PROJECT_SLUG, file_name=AMENDED).exists()


def show(stage: Stage) -> None:
    """Bring the demonstration to where every page has something to show."""
    if not to_do():
        return
    for file in _missing(stage.project):
        if file.name == AMENDED:
            _first_release(stage)
        take_in(stage, file)
    register.set_up_custody(stage.project, stage.users["coordinator"])
    for review_set in _open_sets(stage.project, TARROW_2.name):
        reviewing.decide_some(review_set, stage.users["geochemist"], HALFWAY_M)


def finish(stage: Stage) -> Release:
    """Take in whatever is not in yet, decide on everything, sign it and release it."""
    for file in _missing(stage.project):
        take_in(stage, file)
    register.set_up_custody(stage.project, stage.users["coordinator"])
    for review_set in _open_sets(stage.project):
        stage.say(f"Review of {review_set}")
        reviewing.decide_all(review_set, stage.users["geochemist"])
        _sign(stage, review_set)
    return _release(stage, LAST_RELEASE)


def _missing(project: Project) -> list[DemoFile]:
    """Files that are not in yet; what an interrupted run left half done is ended first."""
    run_all_here(project)
    held = set(
        Upload.objects.filter(project=project)
        .exclude(outcome=Upload.Outcome.FAILED)
        .values_list("file_name", flat=True)
    )
    return [file for file in files() if file.name not in held]


def take_in(stage: Stage, file: DemoFile) -> Upload:
    """One file through intake and QC, as the analyst would upload it."""
    upload = receive(
        project=stage.project, name=file.name, content=file.content, user=stage.users["analyst"],
        lab=file.laboratory.name, well=file.well,
    )  # fmt: skip
    run_all_here(stage.project)
    upload.refresh_from_db()
    if upload.job and upload.job.state == JobState.FAILED:
        raise Conflict(
            f"{file.name} did not come in: {upload.job.error_message}", remedy="Run the demonstration again."
        )
    stage.say(f"Intake of {file.name}: {upload.get_outcome_display()}")
    return upload


def _first_release(stage: Stage) -> None:
    for review_set in _open_sets(stage.project, TARROW_1.name):
        reviewing.decide_all(review_set, stage.users["geochemist"])
        _sign(stage, review_set)
    _release(stage, FIRST_RELEASE)


def _sign(stage: Stage, review_set: ReviewSet) -> None:
    sign_off(
        user=stage.users["approver"], review_set=review_set, password=stage.password, meaning="reviewed_rejections"
    )


def _release(stage: Stage, title: str) -> Release:
    """The next release, or the latest where it already holds exactly the signatures in force."""
    signed = {signature.sign_off for signature in signatures_in_force(stage.project).values()}
    latest = Release.objects.filter(project=stage.project, withdrawn_at=None).first()
    if latest and set(latest.sign_offs.values_list("pk", flat=True)) == signed:
        return latest
    stage.say(f"Release «{title}»")
    return build_release(project=stage.project, user=stage.users["approver"], title=title)


def _open_sets(project: Project, well: str = "") -> list[ReviewSet]:
    """Review sets without a signature in force, of one well or all."""
    sets = ReviewSet.objects.filter(project=project, state=ReviewSetState.OPEN).order_by("pk")
    named = sets.filter(well__name=well) if well else sets
    return [review_set for review_set in named.select_related("well", "project") if valid_signature(review_set) is None]
