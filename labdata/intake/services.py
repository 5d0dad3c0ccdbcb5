"""The door of the intake: receive a file, answer its questions, look before storing."""

import hashlib
from pathlib import PurePath
from typing import Any

from django.contrib.auth.models import User
from django.core.files.base import ContentFile
from django.core.files.storage import default_storage
from django.db import transaction

from labdata import audit
from labdata.access import Action, require
from labdata.errors import Conflict, InvalidInput
from labdata.intake.prepared import Prepared
from labdata.intake.preparing import Request, count_samples, prepare_file
from labdata.jobs import JobContext, enqueue
from labdata.models import Project, Report, SourceFile, Upload

OPEN = (Upload.Outcome.WAITING, Upload.Outcome.REFUSED, Upload.Outcome.FAILED)


def receive(
    *, project: Project, name: str, content: bytes, user: User | None, lab: str = "", well: str = "",
    create_wells: bool = False, answers: dict[str, str] | None = None, idem_key: str | None = None, look: bool = False,
) -> Upload:  # fmt: skip
    """Keep a file's bytes and enqueue its reading. The same bytes again are answered at once, with nothing changed.

    With ``look`` the file is read and then waits for a person, even when nothing has to be asked.
    The same ``idem_key`` again gives the first upload. ``user`` None is the service itself. Raises NotAllowed, NotFound or InvalidInput.
    """
    _may(user, project, create_wells)
    if idem_key and (before := Upload.objects.filter(project=project, job__idem_key=idem_key).first()):
        return before
    name = _file_name(name)
    given = checked_answers(answers)
    sha256 = hashlib.sha256(content).hexdigest()
    stored_as = _keep(sha256, content)
    with transaction.atomic():
        source, _ = SourceFile.objects.get_or_create(
            project=project, sha256=sha256,
            defaults={"name": name, "size": len(content), "stored_as": stored_as, "received_from": user},
        )  # fmt: skip
        upload = Upload.objects.create(
            project=project, source_file=source, file_name=name, laboratory_name=lab.strip()[:160], created_by=user,
            options={"well": well.strip(), "create_wells": create_wells, "look": look} | said_by(given, {}, {}, user),
            answers=given,
        )  # fmt: skip
        report = Report.objects.filter(source_file=source).first()
        if report is not None:
            already_held(upload, report)
        else:
            _enqueue(upload, user, idem_key)
        audit.record(
            "upload.received",
            upload,
            actor=user,
            project=project,
            after={"file": name, "sha256": sha256, "size": len(content)},
        )
    return upload


def answer_questions(*, upload: Upload, user: User | None, answers: dict[str, str]) -> Upload:
    """Add answers to those given before, and read the file again. Raises Conflict once the file is in."""
    _may(user, upload.project, bool(upload.options.get("create_wells")))
    given = checked_answers(answers)
    with transaction.atomic():
        upload = Upload.objects.select_for_update().select_related("project").get(pk=upload.pk)
        if upload.outcome not in OPEN:
            raise Conflict(
                f"«{upload.file_name}» is {upload.get_outcome_display()}; it asks nothing.",
                remedy="Reload the page.",
                upload=upload.pk,
            )
        answers_now = {**upload.answers, **given}
        upload.options |= said_by(answers_now, upload.answers, upload.options, user)
        upload.answers = answers_now
        read_again(upload, user)
        audit.record("upload.answered", upload, actor=user, project=upload.project, after={"answers": given})
    return upload


def preview(
    *, project: Project, name: str, content: bytes, lab: str = "", well: str = "", create_wells: bool = False,
    answers: dict[str, str] | None = None,
) -> dict[str, Any]:  # fmt: skip
    """The entry that receiving the file would give; nothing is written."""
    sha256 = hashlib.sha256(content).hexdigest()
    name = _file_name(name)
    report = Report.objects.filter(project=project, source_file__sha256=sha256).first()
    if report is not None:
        return held_entry(name, sha256, report, None)
    prepared = prepare_file(
        Request(project, name, content, sha256, lab, well, create_wells, checked_answers(answers)), lambda note: None
    )
    counts = prepared.counts()
    if prepared.lands:
        counts |= count_samples(prepared)
    return prepared.entry(counts, prepared.number)


def prepare(upload: Upload, ctx: JobContext) -> Prepared:
    """Read and match the upload's file, outside any transaction."""
    prepared = prepare_file(request_of(upload), lambda note: ctx.tick(note=note))
    prepared.upload = upload
    return prepared


def request_of(upload: Upload) -> Request:
    """What reading the upload's file starts from."""
    with default_storage.open(upload.source_file.stored_as) as stream:
        content = stream.read()
    options = upload.options
    return Request(
        upload.project, upload.file_name, content, upload.source_file.sha256, upload.laboratory_name,
        options.get("well", ""), bool(options.get("create_wells")), upload.answers,
        said_by=options.get("said_by", {}), look=bool(options.get("look")),
    )  # fmt: skip


def said_by(
    answers: dict[str, str], before: dict[str, str], options: dict[str, Any], user: User | None
) -> dict[str, Any]:
    """Options that say who gave each answer; an answer that stays as it was stays with its author."""
    known = options.get("said_by", {})
    name = user.username if user else ""
    names = {id_: known.get(id_, "") if before.get(id_) == text else name for id_, text in answers.items()}
    return {"said_by": names, "corrected_by": user.pk if user else None}


def already_held(upload: Upload, report: Report) -> None:
    """Settle an upload whose bytes the project holds already."""
    upload.outcome = Upload.Outcome.ALREADY_HELD
    upload.report = report
    upload.answer = held_entry(upload.file_name, upload.source_file.sha256, report, upload.pk)
    upload.save(update_fields=["outcome", "report", "answer"])


def settle_waiting(upload: Upload, report: Report) -> None:
    """Other uploads of the same bytes that still wait for answers need none any more."""
    same = Upload.objects.filter(source_file=upload.source_file_id, outcome=Upload.Outcome.WAITING).exclude(
        pk=upload.pk
    )
    for other in same.select_related("source_file"):
        already_held(other, report)


def held_entry(name: str, sha256: str, report: Report | None, upload: int | None) -> dict[str, Any]:
    """The contract's entry for a file that is held already."""
    counts = dict.fromkeys(
        ("wells_new", "samples_new", "samples_matched", "analyses", "results", "qualified", "blank"), 0
    )
    return {
        "file": name, "sha256": sha256, "outcome": str(Upload.Outcome.ALREADY_HELD), "upload": upload, "report": report.number if report else "",
        "seconds": 0.0, "tables": [], "counts": counts, "findings": [],
    }  # fmt: skip


def _may(user: User | None, project: Project, create_wells: bool) -> None:
    if user is not None:
        require(user, project, Action.UPLOAD)
        if create_wells:
            require(user, project, Action.REGISTER)


def _file_name(name: str) -> str:
    plain = PurePath(name.replace("\\", "/")).name.strip()
    if not plain:
        raise InvalidInput("The file has no name.", remedy="Send it with its name.", field="file")
    return plain[-255:]


def checked_answers(answers: dict[str, str] | None) -> dict[str, str]:
    """Answers as texts by question id. Raises InvalidInput."""
    if answers is None:
        return {}
    if not isinstance(answers, dict) or not all(isinstance(value, (str, int, float)) for value in answers.values()):
        raise InvalidInput(
            "Answers are an object of question ids and texts.", remedy='For example {"unit:B": "ft"}.', field="answers"
        )
    return {str(key): str(value) for key, value in answers.items()}


def _keep(sha256: str, content: bytes) -> str:
    """Store the bytes under their checksum, once."""
    path = f"files/{sha256}"
    if default_storage.exists(path):
        return path
    return default_storage.save(path, ContentFile(content))


def read_again(upload: Upload, user: User | None) -> None:
    """Save the upload as it is and enqueue its reading. Inside the caller's transaction."""
    upload.outcome = Upload.Outcome.RECEIVED
    _enqueue(upload, user, None)


def _enqueue(upload: Upload, user: User | None, idem_key: str | None) -> None:
    upload.job = enqueue("intake", {"upload": upload.pk}, project=upload.project, user=user, idem_key=idem_key)
    upload.save()
