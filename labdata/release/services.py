"""Building, withdrawing and proving releases. A release is made from every signed review set of a project."""

from collections.abc import Callable
from dataclasses import replace
from typing import Any

from django.contrib.auth.models import User
from django.db import transaction
from django.db.models import Max
from django.utils import timezone

from labdata import audit, fixity
from labdata.access import Action, require
from labdata.errors import Conflict, InvalidInput, NothingSigned
from labdata.jobs import JobContext, enqueue, run_here
from labdata.models import Job, JobState, Project, Release, Result
from labdata.release import manifest as manifests
from labdata.release import parquet
from labdata.release.rows import read
from labdata.release.selection import Selection, signatures_in_force, working_data
from qc.models import Decision, ReviewSet, SignOff
from qc.review import seal

TITLE_LENGTH = 200


def request_release(*, project: Project, user: User, title: str, idem_key: str | None = None) -> Job:
    """Queue the building of the next release. Raises NotFound or NotAllowed (role), InvalidInput, NothingSigned."""
    require(user, project, Action.RELEASE)
    title = _stated(title, "title", TITLE_LENGTH)
    if not signatures_in_force(project):
        raise _nothing_signed(project)
    params = {"project": project.pk, "user": user.pk, "title": title}
    return enqueue("release", params, project=project, user=user, idem_key=idem_key)


def build_release(*, project: Project, user: User, title: str) -> Release:
    """Build the next release and wait for it. Raises what ``request_release`` raises, and Conflict when it fails."""
    job = run_here(request_release(project=project, user=user, title=title))
    if job.state != JobState.SUCCEEDED:
        refusal = Conflict(job.error_message, job=str(job.pk))
        refusal.code = job.error_code or refusal.code
        raise refusal
    return Release.objects.get(pk=job.result["release"])


def prepare_release(ctx: JobContext) -> Callable[[], dict[str, Any]]:
    """The job: verify the seals, build data and manifest, keep the data; the commit numbers and records it.

    Raises NothingSigned, or Conflict naming a set whose content is no longer what was signed.
    """
    params = ctx.job.params
    project, user = Project.objects.get(pk=params["project"]), User.objects.get(pk=params["user"])
    require(user, project, Action.RELEASE)
    selection = signed_data(project)
    _verify_seals(ctx, selection)
    with ctx.step("building the dataset", allow=1200):
        table = read(selection)
        content, sha256 = parquet.as_bytes(table)
        described = manifests.describe(selection, table, sha256, len(content))
    stored_as = parquet.keep(f"releases/{sha256}.parquet", content)

    def commit() -> dict[str, Any]:
        _refuse_reopened(selection)
        made = _insert(user, params["title"], selection, described, stored_as)
        return {"release": made.pk, "number": made.number, "results": made.result_count, "data_sha256": sha256}

    return commit


def signed_data(project: Project) -> Selection:
    """Current results of every signed set, with the decisions as signed. Raises NothingSigned."""
    signatures = signatures_in_force(project)
    if not signatures:
        raise _nothing_signed(project)
    results = Result.objects.filter(
        current=True, analysis__current=True, analysis__review_item__review_set__in=signatures
    )
    wells = set(ReviewSet.objects.filter(pk__in=signatures).values_list("well", flat=True))
    today = working_data(project, results)
    deciders = set(Decision.objects.filter(review_set__in=signatures).order_by().values_list("decided_by", flat=True))
    return replace(
        today,
        signatures=signatures,
        signed_only=True,
        wells={pk: facts for pk, facts in today.wells.items() if pk in wells},
        qc_runs={well: run for well, run in today.qc_runs.items() if well in wells},
        people={pk: name for pk, name in today.people.items() if pk in deciders},
    )


def _verify_seals(ctx: JobContext, selection: Selection) -> None:
    """See that every signed set still says what was signed. Raises Conflict naming the first that does not."""
    sign_offs = SignOff.objects.filter(pk__in=[s.sign_off for s in selection.signatures.values()])
    records = list(sign_offs.select_related("review_set__well").order_by("pk"))
    for number, record in enumerate(records):
        ctx.tick(number, len(records), note="verifying the signatures")
        if not seal.holds(record):
            raise Conflict(
                f"{record.review_set} is not what {record.signer_name} signed: its content has changed since.",
                remedy="Re-open the set, look at what changed and have it signed again.",
                review_set=record.review_set_id,
            )


def _refuse_reopened(selection: Selection) -> None:
    """Raises Conflict when a set lost its signature while the release was built."""
    list(ReviewSet.objects.select_for_update().filter(pk__in=selection.signatures).order_by("pk"))
    if not selection.signatures.items() <= signatures_in_force(selection.project).items():
        raise Conflict("A review set was re-opened while the release was built.", remedy="Ask for the release again.")


def _insert(user: User, title: str, selection: Selection, described: dict[str, Any], stored_as: str) -> Release:
    project = selection.project
    Project.objects.select_for_update().get(pk=project.pk)
    number = (Release.objects.filter(project=project).aggregate(last=Max("number"))["last"] or 0) + 1
    now = timezone.now()
    whole = {
        **described,
        "number": number,
        "title": title,
        "created_by": user.get_username(),
        "created_at": now.isoformat(),
    }
    made = Release.objects.create(
        project=project, number=number, title=title, created_by=user, created_at=now, manifest=whole,
        manifest_sha256=manifests.sha256_of(whole), data_sha256=described["data"]["sha256"], stored_as=stored_as,
        analysis_count=described["counts"]["analyses"], result_count=described["counts"]["results"],
    )  # fmt: skip
    made.sign_offs.set([signature.sign_off for signature in selection.signatures.values()])
    after = {
        "number": number, "title": title, "data_sha256": made.data_sha256, "manifest_sha256": made.manifest_sha256,
        "facts": fixity.facts("release", made.pk),
    }  # fmt: skip
    audit.record("release.made", made, actor=user, project=project, after=after)
    return made


@transaction.atomic
def withdraw(*, release: Release, user: User, reason: str) -> Release:
    """Say that a release should no longer be used, and why; its bytes stay. Raises NotAllowed, InvalidInput, Conflict."""
    require(user, release.project, Action.WITHDRAW)
    reason = _stated(reason, "reason", 2000)
    held = Release.objects.select_for_update().get(pk=release.pk)
    if held.withdrawn_at is not None:
        raise Conflict(f"{held} was withdrawn already.", remedy="There is nothing left to do.")
    held.withdrawn_at, held.withdrawn_by, held.withdrawn_reason = timezone.now(), user, reason
    held.save(update_fields=["withdrawn_at", "withdrawn_by", "withdrawn_reason"])
    audit.record("release.withdrawn", held, actor=user, project=held.project, reason=reason)
    return held


def rebuild(release: Release) -> str:
    """Build the data of a release once more from the database. Returns its SHA-256: that of the release.

    Whatever happened since (further decisions, a later report version, another QC run, a renamed well) makes no
    difference. The bytes are those of the writer named in the manifest.
    """
    table = read(manifests.selection_of(release.project, release.manifest))
    return parquet.as_bytes(table)[1]


def _nothing_signed(project: Project) -> NothingSigned:
    return NothingSigned(
        f"No review set of project «{project.slug}» is signed.",
        remedy="Decide on a well's results and have them signed.",
    )


def _stated(text: str, field: str, limit: int) -> str:
    """``text`` without blanks around it. Raises InvalidInput when nothing is left, or too much."""
    text = text.strip()
    if not text:
        raise InvalidInput(f"The {field} is blank.", remedy="Say it in a few words.", field=field)
    if len(text) > limit:
        raise InvalidInput(f"The {field} has {len(text)} characters.", remedy=f"At most {limit}.", field=field)
    return text
