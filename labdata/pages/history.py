"""What became of one result, in plain sentences, oldest first."""

from dataclasses import dataclass
from datetime import datetime

from django.contrib.auth.models import User

from labdata.models import Release, Result, Upload
from labdata.pages.sheet_extract import address
from qc.models import Decision, NoteKind, ReasonCode, ReviewSet, SignOff, Verdict
from qc.review import notes


@dataclass(frozen=True)
class Event:
    at: datetime
    text: str
    mark: str = ""


def history(result: Result) -> list[Event]:
    """Import, versions, decisions, notes, signatures and releases of the result."""
    review_set = ReviewSet.objects.filter(items__analysis=result.analysis_id).first()
    events = [_imported(result), *_versions(result), *_decisions(result), *_notes(result)]
    if review_set:
        events += _signatures(review_set)
    return sorted(events, key=lambda event: event.at)


def name(user: User | None) -> str:
    """How a person is named in a sentence."""
    return (user.get_full_name() or user.get_username()) if user else "the service"


def _imported(result: Result) -> Event:
    report = result.analysis.report
    upload = Upload.objects.filter(report=report).select_related("created_by").order_by("pk").first()
    sheet = result.column.table.sheet
    where = f"{sheet}!{address(result)}" if sheet else address(result)
    who = name(upload.created_by) if upload else "the service"
    return Event(
        report.imported_at,
        f"Imported from {where} of «{report.source_file.name}» (report {report}) as «{result.value_reported}»,"
        f" brought in by {who}.",
    )


def _versions(result: Result) -> list[Event]:
    """What earlier versions said, and what later ones made of it."""
    events = []
    earlier = result.supersedes
    while earlier is not None:
        same = (earlier.value, earlier.qualifier) == (result.value, result.qualifier)
        said = "the same value" if same else "another value"
        report = earlier.analysis.report
        events.append(
            Event(report.imported_at, f"Report {report} had said «{earlier.value_reported}»: {said}.", "earlier")
        )
        earlier = earlier.supersedes
    for later in result.successors.select_related("analysis__report", "analyte"):
        report = later.analysis.report
        events.append(
            Event(report.imported_at, f"Superseded by «{later.value_reported}» of report {report}.", "superseded")
        )
    return events


def _decisions(result: Result) -> list[Event]:
    rows = Decision.objects.filter(result=result).select_related("decided_by").order_by("pk")
    return [Event(row.decided_at, _decided(row), row.verdict) for row in rows]


def _decided(decision: Decision) -> str:
    who, why = name(decision.decided_by), ""
    if decision.reason:
        why = f": {ReasonCode(decision.reason).label}"
    if decision.text:
        why += f", «{decision.text}»" if why else f": «{decision.text}»"
    if decision.carried_from_id:
        return f"The verdict «{decision.verdict}» of {who} was carried over, since the value stayed as it was{why}."
    if decision.verdict == Verdict.UNDECIDED:
        return f"{who} took the decision back{why}."
    return f"{who} {'put it on hold' if decision.verdict == Verdict.HELD else f'{decision.verdict} it'}{why}."


def _notes(result: Result) -> list[Event]:
    did = {
        NoteKind.NOTE: "noted", NoteKind.QUESTION: "asked the laboratory", NoteKind.ANSWER: "wrote down its answer",
    }  # fmt: skip
    return [
        Event(note.written_at, f"{name(note.written_by)} {did[NoteKind(note.kind)]}: «{note.text}»", note.kind)
        for note in notes.of_result(result)
    ]


def _signatures(review_set: ReviewSet) -> list[Event]:
    events = []
    for record in SignOff.objects.filter(review_set=review_set).select_related("reopening__reopened_by"):
        events.append(
            Event(record.signed_at, f"{record.signer_name} signed {review_set}: «{record.meaning}»", "signed")
        )
        if hasattr(record, "reopening"):
            undone = record.reopening
            who = name(undone.reopened_by)
            events.append(
                Event(
                    undone.reopened_at, f"{who} re-opened {review_set}: {undone.reason}. The signature ended.", "held"
                )
            )
    for release in Release.objects.filter(sign_offs__review_set=review_set).distinct():
        events.append(
            Event(
                release.created_at, f"{review_set} went into release {release.number}, «{release.title}».", "released"
            )
        )
    return events
