"""The mapping desk's services: look at what corrections would give, store with them, or withdraw the file."""

from collections.abc import Mapping as Pairs
from dataclasses import dataclass, field
from typing import Any

from django.contrib.auth.models import User
from django.db import transaction

from labdata import audit
from labdata.access import Action, require
from labdata.errors import Conflict
from labdata.intake import services, workbook
from labdata.intake.corrections import is_correction
from labdata.intake.prepared import Prepared
from labdata.intake.preparing import CONFIRM, STORE_IT, count_samples, prepare_file
from labdata.models import Upload


@dataclass(frozen=True)
class Draft:
    """What a person has set on the desk: all answers and corrections, and the particulars of the file."""

    answers: Pairs[str, str] = field(default_factory=dict)
    lab: str = ""
    well: str = ""
    create_wells: bool = False
    remember: bool = True

    @classmethod
    def of(cls, upload: Upload) -> "Draft":
        """As the upload stands."""
        options = upload.options
        return cls(
            upload.answers,
            upload.laboratory_name,
            options.get("well", ""),
            bool(options.get("create_wells")),
            bool(options.get("remember", True)),
        )

    @property
    def corrects(self) -> bool:
        return any(is_correction(id_) for id_ in self.answers)


def is_open(upload: Upload) -> bool:
    """True while the file has not landed, was not withdrawn, and is not being read; also when its reading broke off."""
    return upload.outcome in {*services.OPEN, Upload.Outcome.RECEIVED} and (upload.job is None or upload.job.settled)


def look(
    upload: Upload, draft: Draft, user: User, book: workbook.Workbook | None = None
) -> tuple[Prepared, dict[str, int]]:
    """The file as it would be stored with the draft, and its counts; nothing is written.

    Raises NotAllowed or NotFound.
    """
    _may(user, upload, draft)
    names = services.said_by(dict(draft.answers), upload.answers, upload.options, user)["said_by"]
    request = services.request_of(upload)
    request.answers, request.said_by, request.book = {**draft.answers, CONFIRM: STORE_IT}, names, book
    request.lab, request.well, request.create_wells = draft.lab, draft.well, draft.create_wells
    prepared = prepare_file(request, lambda note: None)
    counts = prepared.counts()
    if prepared.lands:
        counts |= count_samples(prepared)
    return prepared, counts


def store_with(*, upload: Upload, user: User, draft: Draft, keep: bool = False) -> Upload:
    """Take the draft as the upload's answers and have the file read and stored with them.

    With ``keep`` it is read and then waits for a further look, so that work on the desk can go on later.
    Raises NotAllowed, NotFound, or Conflict once the file is in, was withdrawn or is being read.
    """
    _may(user, upload, draft)
    with transaction.atomic():
        held = _open(upload)
        before = {"answers": held.answers, **_particulars(held)}
        given = {id_: text for id_, text in draft.answers.items() if id_ != CONFIRM}
        answers = services.checked_answers(given if keep else {**given, CONFIRM: STORE_IT})
        held.options = {
            **held.options, **services.said_by(answers, held.answers, held.options, user), "well": draft.well.strip(),
            "create_wells": draft.create_wells, "remember": draft.remember, "look": keep or bool(held.options.get("look")),
        }  # fmt: skip
        held.answers, held.laboratory_name = answers, draft.lab.strip()[:160]
        services.read_again(held, user)
        after = {"answers": answers, **_particulars(held)}
        audit.record("upload.corrected", held, actor=user, project=held.project, before=before, after=after)
    return held


def withdraw(*, upload: Upload, user: User) -> Upload:
    """Walk away from a file that has not landed; its bytes stay in the file store. Raises as ``store_with`` does."""
    require(user, upload.project, Action.UPLOAD)
    with transaction.atomic():
        held = _open(upload)
        before = {"outcome": held.outcome}
        held.outcome = Upload.Outcome.WITHDRAWN
        held.save(update_fields=["outcome"])
        audit.record(
            "upload.withdrawn", held, actor=user, project=held.project, before=before, after={"outcome": held.outcome}
        )
    return held


def _may(user: User, upload: Upload, draft: Draft) -> None:
    require(user, upload.project, Action.UPLOAD)
    if draft.create_wells:
        require(user, upload.project, Action.REGISTER)


def _open(upload: Upload) -> Upload:
    """The upload, locked. Raises Conflict when nothing can be changed any more, or not now."""
    held = Upload.objects.select_for_update().get(pk=upload.pk)
    if not is_open(held):
        state = "being read" if held.job is not None and not held.job.settled else held.get_outcome_display()
        raise Conflict(
            f"«{held.file_name}» is {state}; its mapping cannot be changed now.",
            remedy="Reload the page.",
            upload=held.pk,
        )
    return held


def _particulars(upload: Upload) -> dict[str, Any]:
    return {
        "laboratory": upload.laboratory_name,
        "well": upload.options.get("well", ""),
        "create_wells": bool(upload.options.get("create_wells")),
    }
