"""What people say to each other about a result or a flag, and what leaves as a question to the laboratory."""

from collections.abc import Iterable
from typing import Any

from django.contrib.auth.models import User
from django.db import transaction
from django.db.models import Q, QuerySet

from labdata.access import GRANTS, Action, AnyUser, actions, require
from labdata.errors import Conflict, InvalidInput, NotAllowed, NotFound
from labdata.models import Project, Result, Role
from labdata.pages.sheet_extract import address
from labdata.templatetags.show import interval, reported_depth, value
from qc.models import Flag, Note, NoteKind, ReviewSet
from qc.review import changes

MAY_WRITE = {Action.DECIDE, Action.UPLOAD, Action.SIGN}
LENGTH = 4000
Mark = tuple[str, str]  # rule and fingerprint of a flag


def may_write(user: AnyUser, project: Project) -> bool:
    """Whether the user may write; every member reads."""
    return bool(actions(user, project) & MAY_WRITE)


@transaction.atomic
def write(
    *,
    user: User,
    review_set: ReviewSet,
    text: str,
    kind: str = NoteKind.NOTE,
    result_id: int | None = None,
    flag: Mark | None = None,
    answers: int | None = None,
) -> Note:
    """Add to the thread of a result, or of a flag given by rule and fingerprint. A signed set may be talked about too.

    Raises NotAllowed (role), InvalidInput (nothing said, unknown kind), NotFound (a result, flag or question that is
    not of this set) or Conflict (a question that is answered already).
    """
    _require(user, review_set.project)
    said = _checked(text, kind)
    question = _question(review_set, answers) if kind == NoteKind.ANSWER else None
    if question is not None:
        result, rule, mark = question.result, question.rule, question.fingerprint
    else:
        result, rule, mark = _about(review_set, result_id, flag)
    made = Note.objects.create(
        review_set=review_set, result=result, rule=rule, fingerprint=mark, kind=kind, answers=question, text=said,
        written_by=user,
    )  # fmt: skip
    what = f"wrote a {NoteKind(kind).label} on {subject(made)}"
    changes.log(changes.NOTED, review_set, user, what, note=made.pk, kind=kind, text=said)
    return made


def _require(user: User, project: Project) -> None:
    require(user, project, Action.VIEW)
    if not may_write(user, project):
        able = ", ".join(role.label for role in Role if GRANTS[role] & MAY_WRITE)
        raise NotAllowed(f"{user} may not write notes in project «{project.slug}».", remedy=f"Roles that may: {able}.")


def _checked(text: str, kind: str) -> str:
    if kind not in NoteKind.values:
        raise InvalidInput(
            f"«{kind}» is no kind of note.", remedy=f"Kinds: {', '.join(NoteKind.values)}.", field="kind"
        )
    said = text.strip()
    if not said:
        raise InvalidInput("A note says something.", remedy="Write it, then send it.", field="text")
    if len(said) > LENGTH:
        raise InvalidInput(f"The note has {len(said)} characters.", remedy=f"Say it in at most {LENGTH}.", field="text")
    return said


def _question(review_set: ReviewSet, answers: int | None) -> Note:
    """The open question that is answered."""
    found = Note.objects.select_for_update(of=("self",)).filter(
        review_set=review_set, kind=NoteKind.QUESTION, pk=answers or 0
    )
    question = found.first()
    if question is None:
        raise NotFound(f"{review_set} has no question {answers}.", remedy="Load the page again.")
    if question.answered_by.exists():
        raise Conflict(f"Question {answers} is answered already.", remedy="Add a note instead.")
    return question


def _about(review_set: ReviewSet, result_id: int | None, flag: Mark | None) -> tuple[Result | None, str, str]:
    """What the note is about: a result, rule and fingerprint of a flag, or both."""
    if flag is not None:
        raised = flags(review_set, [flag]).first()
        if raised is None:
            raise NotFound(f"{review_set.well} has no such flag of «{flag[0]}».", remedy="Load the review page again.")
        return raised.result, *flag
    result = Result.objects.filter(analysis__review_item__review_set=review_set, pk=result_id or 0).first()
    if result is None:
        raise NotFound(f"{review_set} has no result {result_id}.", remedy="Load the page again.")
    return result, "", ""


def flags(review_set: ReviewSet, marks: Iterable[Mark]) -> QuerySet[Flag]:
    """Flags of the set or its well by rule and fingerprint, of any run, newest first."""
    named = Q(pk__in=[])
    for rule, mark in marks:
        named |= Q(rule=rule, fingerprint=mark)
    own = Q(analysis__review_item__review_set=review_set) | Q(analysis=None)
    return Flag.objects.filter(named, own, well=review_set.well_id).order_by("-pk")


def of_result(result: Result) -> QuerySet[Note]:
    """The thread of a result: what was said of it and of flags on it, and on the values it supersedes, oldest first."""
    line = [result.pk]
    earlier = result.supersedes
    while earlier is not None:
        line.append(earlier.pk)
        earlier = earlier.supersedes
    return Note.objects.filter(result__in=line).select_related("written_by", "answers").order_by("pk")


def thread(said: Iterable[Note]) -> list[dict[str, Any]]:
    """Notes for a page: each question says whether it is open, and what would be sent of it."""
    rows = list(said)
    answered = {note.answers_id for note in rows}
    return [
        {
            "note": note, "by": name(note.written_by), "open": note.kind == NoteKind.QUESTION and note.pk not in answered,
            "letter": letter(note.review_set, [note]) if note.kind == NoteKind.QUESTION else "",
        }
        for note in rows
    ]  # fmt: skip


def open_questions(review_set: ReviewSet) -> QuerySet[Note]:
    """Questions to the laboratory that nobody has answered."""
    asked = Note.objects.filter(review_set=review_set, kind=NoteKind.QUESTION, answered_by=None)
    return asked.select_related("written_by", "result").order_by("pk")


def told(review_set: ReviewSet) -> list[dict[str, Any]]:
    """All notes of the set as plain data, oldest first."""
    rows = Note.objects.filter(review_set=review_set).select_related("written_by").order_by("pk")
    answered = set(rows.filter(answers__isnull=False).values_list("answers", flat=True))
    return [
        {
            "id": note.pk, "kind": note.kind, "text": note.text, "by": name(note.written_by), "at": note.written_at,
            "rule": note.rule, "mark": note.fingerprint, "result": note.result_id, "answers": note.answers_id,
            "open": note.kind == NoteKind.QUESTION and note.pk not in answered,
        }
        for note in rows
    ]  # fmt: skip


def name(user: User) -> str:
    return user.get_full_name() or user.get_username()


def subject(note: Note) -> str:
    """What a note is about, in a few words."""
    if note.result is not None:
        return f"{note.result.analyte} of {note.result.analysis.sample}"
    return f"a flag of {note.rule}"


def letter(review_set: ReviewSet, questions: Iterable[Note]) -> str:
    """The questions as one plain text to send: every value with its sample, depth, cell and what the check says."""
    parts = [_part(number, note) for number, note in enumerate(questions, start=1)]
    head = f"Questions to the laboratory\nProject {review_set.project.name}, well {review_set.well.name}"
    foot = "Please answer by an amended report, or in words naming the question's number in square brackets."
    return "\n\n".join([head, *(parts or ["No question is open."]), foot]) + "\n"


def _part(number: int, note: Note) -> str:
    flag = flags(note.review_set, [(note.rule, note.fingerprint)]).first() if note.fingerprint else None
    lines = [f"{number}. [question {note.pk}] asked by {name(note.written_by)}, {note.written_at:%Y-%m-%d}"]
    if note.result is not None:
        lines += _facts(note.result)
    elif flag is not None:
        lines += _inputs(flag)
    if flag is not None:
        lines.append(f"   The check says: {flag.message} (rule {flag.rule})")
    asked = note.text.replace("\n", "\n   ")
    return "\n".join([*lines, f"   Question: {asked}"])


def _facts(result: Result) -> list[str]:
    """Sample, depth, analyte, value and cell of one result."""
    analysis, column = result.analysis, result.column
    sample, report = analysis.sample, analysis.report
    lines = [f"   Report: {report}, file {report.source_file.name}"]
    if sample is not None:
        run = f", run {analysis.replicate}" if analysis.replicate > 1 else ""
        reported = f" (as reported: {reported_depth(sample)})" if sample.top_reported else ""
        lines += [
            f"   Sample: {sample.label or 'no label'}{run}", f"   Depth: {interval(sample)} m measured depth{reported}",
        ]  # fmt: skip
    sheet = f"{column.table.sheet}!" if column.table.sheet else ""
    return [
        *lines, f"   Value of: {result.analyte} ({analysis.method})",
        f"   Value: «{result.value_reported}» {column.unit_reported}, read as {value(result)} {result.analyte.unit}",
        f"   Cell: {sheet}{address(result)}",
    ]  # fmt: skip


def _inputs(flag: Flag) -> list[str]:
    """The cells behind a flag that speaks of more than one value, or the depths it speaks of."""
    lines = []
    if flag.analysis is not None and flag.analysis.sample is not None:
        sample = flag.analysis.sample
        lines.append(f"   Sample: {sample.label or 'no label'}, {interval(sample)} m measured depth")
    ends = flag.evidence.get("interval_m")
    if ends:
        lines.append(f"   Depth: {ends[0]:g} – {ends[1]:g} m measured depth")
    for one in flag.evidence.get("inputs") or []:
        cell = "!".join(str(one[part]) for part in ("sheet", "cell") if one.get(part))
        said = [
            one.get("sample"),
            one.get("analyte"),
            f"«{one.get('text', '')}»",
            one.get("unit"),
            f"cell {cell}" if cell else "",
        ]
        lines.append("   Value: " + " ".join(str(part) for part in said if part))
    return lines
