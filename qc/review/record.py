"""What exactly a signature covers, rebuilt as it stood at that moment, however often the set has changed since.

Decisions and report versions are append-only, so the past can be read back from them; the hash kept with the
signature says whether it was read back right.
"""

import hashlib
from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from django.contrib.auth.models import User
from django.db.models import Max, Q

from labdata.audit import canonical
from labdata.models import AuditEntry, Report, Result
from qc.models import Decision, FlagAnswer, ReasonCode, Reopening, SignOff, Verdict
from qc.review import changes
from qc.review.seal import IDENTITY, VALUE


@dataclass(frozen=True)
class Line:
    """One result as it was signed. ``identity`` and ``value``: the fields that the seal is made over."""

    identity: tuple[Any, ...]
    value: tuple[Any, ...]
    reported: str
    report: int
    decision: Decision

    @property
    def sealed(self) -> str:
        """The canonical line, as in qc/review/seal.py."""
        return canonical([*self.identity, *self.value, self.decision.verdict, self.decision.reason, self.decision.text])

    @property
    def sample(self) -> str:
        """Label and depth of the sample, and the replicate where there are several."""
        _, label, top, base, _, replicate, *_ = self.identity
        depth = "" if top is None else f"{top:.2f}" if base in (None, top) else f"{top:.2f}–{base:.2f}"
        run = f"run {replicate}" if replicate > 1 else ""
        return ", ".join(part for part in (label or "no label", f"{depth} m" if depth else "", run) if part)

    @property
    def analyte(self) -> str:
        return str(self.identity[-1])

    @property
    def why(self) -> str:
        """The reason of the verdict in words."""
        label = str(ReasonCode(self.decision.reason).label) if self.decision.reason else ""
        return ": ".join(part for part in (label, self.decision.text) if part)


@dataclass(frozen=True)
class Change:
    """One result that differs from what the signature before covered; ``before`` or ``now`` is empty where it came or went."""

    name: str
    before: str
    now: str


@dataclass(frozen=True)
class Record:
    """Everything the signed record shows."""

    sign_off: SignOff
    lines: list[Line]
    whole: bool  # the lines hash to what was signed
    previous: SignOff | None
    changed: list[Change]
    events: list[changes.Event]
    answers: list[tuple[str, str, str, str, int]]  # rule, answer, reason, person, how many flags
    reports: list[tuple[Report, int]]
    reopening: Reopening | None

    def of(self, verdict: Verdict) -> list[Line]:
        return [line for line in self.lines if line.decision.verdict == verdict]

    def by_analyte(self) -> dict[str, Counter[str]]:
        """Results per analyte and verdict."""
        counts: dict[str, Counter[str]] = {}
        for line in self.lines:
            counts.setdefault(line.analyte, Counter())[line.decision.verdict] += 1
        return counts


def record(sign_off: SignOff) -> Record:
    """The record of one signature, in force or not."""
    lines = signed_lines(sign_off)
    previous = sign_off.review_set.sign_offs.filter(pk__lt=sign_off.pk).order_by("-pk").first()
    return Record(
        sign_off=sign_off, lines=lines, whole=_hash(sign_off, lines) == sign_off.content_sha256, previous=previous,
        changed=_changed(signed_lines(previous), lines) if previous else [],
        events=_events(previous, sign_off) if previous else [], answers=_answers(sign_off), reports=_reports(lines),
        reopening=Reopening.objects.filter(sign_off=sign_off).select_related("reopened_by").first(),
    )  # fmt: skip


def name(user: User | None) -> str:
    """A person's printed name with the account's; the service where there is none."""
    if user is None:
        return "the service"
    full = user.get_full_name()
    return f"{full} ({user.get_username()})" if full else user.get_username()


def signed_lines(sign_off: SignOff) -> list[Line]:
    """The results of the set that counted when it was signed, with the verdict that stood, shallow first."""
    at = sign_off.signed_at
    given = Decision.objects.filter(review_set=sign_off.review_set_id, decided_at__lte=at)
    newest = given.values("result").annotate(newest=Max("pk")).values("newest")
    stood = {
        decision.result_id: decision
        for decision in Decision.objects.filter(pk__in=newest).select_related("decided_by").order_by("pk")
    }
    later = Q(analysis__report__superseded_by__imported_at__lte=at)
    rows = (
        Result.objects.filter(analysis__review_item__review_set=sign_off.review_set_id)
        .filter(analysis__report__imported_at__lte=at)
        .filter(Q(current=True) | ~later)
        .order_by(
            "analysis__sample__top_md_m", "analysis__sample__label", "analysis__replicate", "analyte__order", "pk"
        )
        .values_list("pk", *IDENTITY, *VALUE, "value_reported", "analysis__report")
    )
    end = 1 + len(IDENTITY)
    return [
        Line(row[1:end], row[end : end + len(VALUE)], row[-2], row[-1], stood[row[0]])
        for row in rows
        if row[0] in stood
    ]


def _hash(sign_off: SignOff, lines: Iterable[Line]) -> str:
    """The seal over these lines (``seal.content_sha256`` makes the same of what stands today)."""
    well = sign_off.review_set.well
    text = "\n".join([canonical(["well", well.name, well.uwi]), *sorted(line.sealed for line in lines)])
    return hashlib.sha256(text.encode()).hexdigest()


def _changed(before: Iterable[Line], now: Iterable[Line]) -> list[Change]:
    """What differs in value or verdict between two signatures of the set."""
    old, new = ({line.identity: line for line in lines} for lines in (before, now))
    named = {**old, **new}
    return [
        Change(f"{line.analyte} of {line.sample}", _said(old.get(key)), _said(new.get(key)))
        for key, line in named.items()
        if key not in old or key not in new or old[key].sealed != new[key].sealed
    ]


def _said(line: Line | None) -> str:
    if line is None:
        return ""
    why = f" ({line.why})" if line.why else ""
    return f"{line.reported}, {line.decision.verdict}{why}"


def _events(previous: SignOff, sign_off: SignOff) -> list[changes.Event]:
    """What happened to the set between two signatures, oldest first."""
    entries = AuditEntry.objects.filter(
        object_type="reviewset", object_id=str(sign_off.review_set_id), at__gt=previous.signed_at, at__lt=sign_off.signed_at
    ).exclude(action=changes.SIGNED)  # fmt: skip
    return [
        changes.Event(*row)
        for row in entries.order_by("seq").values_list("at", "actor_name", "after__what", "reason")
    ]  # fmt: skip


def _answers(sign_off: SignOff) -> list[tuple[str, str, str, str, int]]:
    """Flags agreed with or dismissed by then, alike ones counted together."""
    given = FlagAnswer.objects.filter(review_set=sign_off.review_set_id, answered_at__lte=sign_off.signed_at)
    latest = {(one.rule, one.fingerprint): one for one in given.select_related("answered_by").order_by("pk")}
    counts = Counter((one.rule, one.answer, one.reason, name(one.answered_by)) for one in latest.values())
    return [(*key, count) for key, count in sorted(counts.items())]


def _reports(lines: Iterable[Line]) -> list[tuple[Report, int]]:
    """The laboratory reports that the results are from, with how many."""
    counts = Counter(line.report for line in lines)
    found = Report.objects.filter(pk__in=counts).select_related("source_file", "laboratory").order_by("pk")
    return [(report, counts[report.pk]) for report in found]


def when(at: datetime) -> str:
    """Date and time in UTC, to the second."""
    return f"{at:%Y-%m-%d %H:%M:%S} UTC"
