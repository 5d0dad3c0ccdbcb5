"""The signed record as a PDF: the same bytes whenever it is asked for, as long as the signature stands as it does."""

from collections.abc import Iterable, Sequence
from functools import cache
from importlib.util import find_spec
from io import BytesIO
from pathlib import Path
from typing import Any
from xml.sax.saxutils import escape

from reportlab.lib import colors
from reportlab.lib.pagesizes import A4
from reportlab.lib.styles import ParagraphStyle
from reportlab.lib.units import mm
from reportlab.pdfbase import pdfmetrics
from reportlab.pdfbase.ttfonts import TTFont
from reportlab.pdfgen.canvas import Canvas
from reportlab.platypus import Flowable, LongTable, Paragraph, SimpleDocTemplate, Spacer, TableStyle

from qc.models import Verdict
from qc.review.record import Record, name, when

BODY, BOLD = "Body", "Body-Bold"
INK, SOFT, LINE = colors.HexColor("#1b2526"), colors.HexColor("#4f5a5b"), colors.HexColor("#b9c4c1")
WIDTH = A4[0] - 36 * mm - 12  # points; the frame keeps six on each side
SCOPE = (
    "This record speaks only of the results counted here. Verdicts, reasons and flags are opinions of the people named;"
    " the values are the laboratory's, as received."
)
VERDICTS = (Verdict.ACCEPTED.value, Verdict.REJECTED.value, Verdict.HELD.value, Verdict.UNDECIDED.value)
END = "End of the signed record"


@cache
def _fonts() -> None:
    """A typeface that has the letters of people's names and the signs of the trade, embedded in the file."""
    origin = getattr(find_spec("matplotlib"), "origin", None) or ""
    folder = Path(origin).parent / "mpl-data" / "fonts" / "ttf"
    for face, file in ((BODY, "DejaVuSans.ttf"), (BOLD, "DejaVuSans-Bold.ttf")):
        pdfmetrics.registerFont(TTFont(face, str(folder / file)))


def record_pdf(record: Record, *, compress: bool = True) -> bytes:
    """The record on A4 pages, numbered, with an end mark. ``compress`` False leaves the page contents readable."""
    _fonts()
    out = BytesIO()
    sign_off = record.sign_off
    document = SimpleDocTemplate(
        out, pagesize=A4, leftMargin=18 * mm, rightMargin=18 * mm, topMargin=18 * mm, bottomMargin=24 * mm,
        title=f"Signed record of {sign_off.review_set}", author=sign_off.signer_name, invariant=1,
        pageCompression=int(compress),
    )  # fmt: skip
    foot = f"{sign_off.review_set} · signature {sign_off.pk} · signed by {sign_off.signer_name}, {when(sign_off.signed_at)}"

    def canvas(*args: Any, **kwargs: Any) -> Canvas:
        return _Numbered(*args, foot=foot, **kwargs)

    document.build(_story(record), canvasmaker=canvas)
    return out.getvalue()


class _Numbered(Canvas):  # type: ignore[misc]
    """A canvas that writes "page n of m" and the signature at the foot of every page, once m is known."""

    def __init__(self, *args: Any, foot: str, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.foot = foot
        self.kept: list[dict[str, Any]] = []

    def showPage(self) -> None:  # noqa: N802 - the library's name
        self.kept.append(dict(self.__dict__))
        self._startPage()

    def save(self) -> None:
        for number, page in enumerate(self.kept, start=1):
            self.__dict__.update(page)
            self._foot(number, len(self.kept))
            super().showPage()
        super().save()

    def _foot(self, number: int, pages: int) -> None:
        self.setStrokeColor(LINE)
        self.line(18 * mm, 18 * mm, A4[0] - 18 * mm, 18 * mm)
        self.setFillColor(SOFT)
        self.setFont(BODY, 7)
        self.drawString(18 * mm, 14 * mm, self.foot[:120])
        self.drawRightString(A4[0] - 18 * mm, 10 * mm, f"page {number} of {pages}")


def _style(face: str = BODY, size: float = 8.5, **more: Any) -> ParagraphStyle:
    return ParagraphStyle("plain", fontName=face, fontSize=size, leading=size * 1.35, textColor=INK, **more)


def _words(text: str, face: str = BODY, size: float = 8.5, **more: Any) -> Paragraph:
    return Paragraph(escape(text), _style(face, size, **more))


def _heading(text: str) -> Paragraph:
    return _words(text, BOLD, 10.5, spaceBefore=9, spaceAfter=3, keepWithNext=1)


def _table(head: Sequence[str], rows: Iterable[Sequence[str]], widths: Sequence[float]) -> LongTable:
    """Rows under a head that every page repeats; ``widths`` as shares of the page."""
    cells = [[_words(text, BOLD, 7.5) for text in head]]
    cells += [[_words(text, size=7.5, splitLongWords=1) for text in row] for row in rows]
    table = LongTable(cells, colWidths=[WIDTH * share / sum(widths) for share in widths], repeatRows=1)
    table.setStyle(_LINES)
    return table


_LINES = TableStyle([
    ("LINEBELOW", (0, 0), (-1, 0), 0.8, INK), ("LINEBELOW", (0, 1), (-1, -1), 0.3, LINE), ("VALIGN", (0, 0), (-1, -1), "TOP"),
    ("TOPPADDING", (0, 0), (-1, -1), 1.5), ("BOTTOMPADDING", (0, 0), (-1, -1), 2), ("LEFTPADDING", (0, 0), (-1, -1), 2),
    ("RIGHTPADDING", (0, 0), (-1, -1), 4),
])  # fmt: skip


def _facts(pairs: Iterable[tuple[str, str]]) -> LongTable:
    rows = [[_words(label, size=8.5), _words(text, BOLD if label == "Printed name" else BODY)] for label, text in pairs]
    table = LongTable(rows, colWidths=[38 * mm, WIDTH - 38 * mm])
    table.setStyle(_LINES)
    return table


def _story(record: Record) -> list[Flowable]:
    """The record from top to end mark."""
    review_set = record.sign_off.review_set
    return [
        _words("Signed record", BOLD, 16, spaceAfter=2),
        _words(f"Well {review_set.well.name}, review set {review_set.number}, project {review_set.project.name}", size=11),
        Spacer(1, 6), *_signature(record), *_content(record), *_rejected(record), *_flags(record), *_since(record),
        *_sources(record), Spacer(1, 10), _words(SCOPE, size=7.5), Spacer(1, 4),
        _words(f"— {END}: {review_set}, signature {record.sign_off.pk} —", BOLD, 8.5, alignment=1),
    ]  # fmt: skip


def _signature(record: Record) -> list[Flowable]:
    sign_off, undone = record.sign_off, record.reopening
    state = "in force"
    if undone:
        state = f"ended: re-opened {when(undone.reopened_at)} by {name(undone.reopened_by)}, because: {undone.reason}"
    return [_heading("Signature"), _facts([
        ("Printed name", sign_off.signer_name), ("Account", sign_off.signed_by.get_username()),
        ("Date and time", when(sign_off.signed_at)), ("Meaning", sign_off.meaning), ("State", state),
    ])]  # fmt: skip


def _content(record: Record) -> list[Flowable]:
    sign_off, well = record.sign_off, record.sign_off.review_set.well
    run = sign_off.qc_run
    qc = "no QC had run" if run is None else (
        f"run {run.pk} of {when(run.started_at)}, rule set {run.rule_set.name} version {run.rule_set.version}"
    )  # fmt: skip
    checked = "read back: the results and verdicts of then give this hash" if record.whole else (
        "the results of then no longer give this hash: names or depths in the registry were corrected since"
    )  # fmt: skip
    counts = sign_off.counts
    return [
        _heading("What was signed"),
        _facts([
            ("Well", " · ".join(part for part in (well.name, well.uwi) if part)),
            ("Results", f"{counts['results']}: " + ", ".join(f"{counts[verdict]} {verdict}" for verdict in VERDICTS)),
            ("Open holds", str(counts["held"]) if counts["held"] else "none: a set is not signed while a result is on hold"),
            ("Quality control", qc), ("Content hash", f"SHA-256 {sign_off.content_sha256}"), ("", checked),
        ]),
        Spacer(1, 6),
        _table(
            ("Value of", "Results", "Accepted", "Rejected"),
            [(code, str(sum(n.values())), str(n[Verdict.ACCEPTED]), str(n[Verdict.REJECTED]))
             for code, n in record.by_analyte().items()],
            (3, 1, 1, 1),
        ),
    ]  # fmt: skip


def _rejected(record: Record) -> list[Flowable]:
    lines = record.of(Verdict.REJECTED)
    if not lines:
        return [_heading("Rejected results"), _words("None.")]
    rows = [
        (line.sample, line.analyte, f"{line.reported} → {_value(line.value)}", line.why,
         f"{name(line.decision.decided_by)}, {line.decision.decided_at:%Y-%m-%d %H:%M}")
        for line in lines
    ]  # fmt: skip
    head = ("Sample", "Value of", "As reported → stored", "Reason", "By, on (UTC)")
    return [_heading(f"Rejected results: {len(lines)}"), _table(head, rows, (5, 2, 4, 6, 5))]


def _value(value: tuple[Any, ...]) -> str:
    number, qualifier, unit = value
    return f"{qualifier}{'limit not stated' if number is None else f'{number:.6g}'} {unit}".strip()


def _flags(record: Record) -> list[Flowable]:
    if not record.answers:
        return []
    rows = [(rule, f"{count} {answer}", reason, who) for rule, answer, reason, who, count in record.answers]
    return [_heading("Flags answered"), _table(("Rule", "Flags", "Reason", "By"), rows, (5, 3, 8, 5))]


def _since(record: Record) -> list[Flowable]:
    previous = record.previous
    if previous is None:
        return [_heading("Changes since the last signature"), _words("This is the first signature of the set.")]
    last = f"The signature before: {previous.signer_name}, {when(previous.signed_at)}, hash {previous.content_sha256[:16]}…"
    story = [_heading("Changes since the last signature"), _words(last), Spacer(1, 4)]
    if record.changed:
        rows = [(one.name, one.before or "not in it", one.now or "no longer in it") for one in record.changed]
        story += [_table(("Result", "Signed before", "Signed now"), rows, (6, 7, 7)), Spacer(1, 4)]
    else:
        story += [_words("No value and no verdict differs."), Spacer(1, 4)]
    events = [(when(one.at), one.by, f"{one.what}{f' ({one.reason})' if one.reason else ''}") for one in record.events]
    return [*story, _table(("When", "Who", "What"), events, (5, 3, 12))] if events else story


def _sources(record: Record) -> list[Flowable]:
    rows = [
        (
            str(report),
            str(report.laboratory or "not stated"),
            report.source_file.name,
            report.source_file.sha256,
            str(count),
        )
        for report, count in record.reports
    ]
    head = ("Report", "Laboratory", "File", "SHA-256 of the file", "Results")
    return [_heading("Made from"), _table(head, rows, (3, 3, 4, 8, 1.6))] if rows else []
