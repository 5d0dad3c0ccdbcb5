"""A whole figure: title, plot, legend and the line that says what the data are; then its bytes.

The same data give the same bytes: no date is written, and the names inside an SVG are made with a fixed salt.
"""

from collections.abc import Mapping, Sequence
from io import BytesIO
from textwrap import wrap
from typing import Any

import matplotlib
from django.contrib.auth.models import User
from django.db.models import Max
from matplotlib.figure import Figure

from labdata.errors import InvalidInput
from qc.models import Decision, QcRun, ReviewSet
from qc.review.data import review_data
from qc.review.drawings.marks import Point, legend_marks
from qc.review.drawings.pairs import draw_pair, plan
from qc.review.drawings.points import chosen, columns
from qc.review.drawings.tracks import INK, SOFT, draw_tracks, legend_bands
from qc.review.figures import TRACKS_AT_FIRST
from qc.review.standing import results_of

FORMATS = {"svg": "image/svg+xml", "png": "image/png", "pdf": "application/pdf"}
NO_DATES: dict[str, dict[str, Any]] = {
    "svg": {"Date": None, "Creator": None}, "png": {"Software": None}, "pdf": {"CreationDate": None, "Producer": None, "Creator": None},
}  # fmt: skip
MOST_TRACKS = 12
LETTERS = 19  # of the status line, an inch
TALL, WIDE = (8.27, 11.69), (11.69, 8.27)  # A4 in inches
matplotlib.rcParams.update({
    "svg.hashsalt": "kerogate", "svg.fonttype": "none", "pdf.fonttype": 42, "text.parse_math": False, "font.size": 8,
    "axes.unicode_minus": True,
})  # fmt: skip


def tracks(review_set: ReviewSet, user: User, keys: Sequence[str] = ()) -> Figure:
    """Depth tracks of the columns named, or the page's first ones. Raises InvalidInput for one that is not there."""
    data = review_data(review_set, user)
    found = columns(data)
    some = [chosen(found, key) for key in keys or list(found)[:TRACKS_AT_FIRST]]
    if not some:
        raise InvalidInput(f"{review_set} holds no values.", remedy="There is nothing to draw.")
    if len(some) > MOST_TRACKS:
        raise InvalidInput(f"{len(some)} tracks do not fit a page.", remedy=f"Choose at most {MOST_TRACKS}.")
    size = (4.2, TALL[1]) if len(some) == 1 else TALL if len(some) <= 7 else WIDE
    figure = Figure(figsize=size)
    points = draw_tracks(figure, data, some, (0.8 / size[0], 1.45 / size[1], 1 - 0.3 / size[0], 1 - 0.95 / size[1]))
    title = some[0].sent["label"] if len(some) == 1 else "depth tracks"
    _words(figure, review_set, data, title)
    _legend(figure, points, *legend_bands(data["bands"]))
    return figure


def pair(review_set: ReviewSet, user: User, x: str, y: str) -> Figure:
    """The cross-plot of two columns. Raises InvalidInput for one that is not there."""
    data = review_data(review_set, user)
    found = columns(data)
    across, along = chosen(found, x), chosen(found, y)
    figure = Figure(figsize=(6.3, 6.3))
    axes = figure.add_axes((0.12, 0.235, 0.83, 0.655))
    points = draw_pair(axes, data, across, along)
    _words(figure, review_set, data, plan(across, along).title)
    handles, labels = axes.get_legend_handles_labels()
    _legend(figure, points, handles, labels)
    return figure


def as_bytes(figure: Figure, file_format: str) -> bytes:
    """The figure as svg, png (200 dots an inch) or pdf. Raises InvalidInput for another format."""
    if file_format not in FORMATS:
        raise InvalidInput(f"«{file_format}» is no format of a figure.", remedy=f"Formats: {', '.join(FORMATS)}.")
    out = BytesIO()
    figure.savefig(out, format=file_format, dpi=200, metadata=NO_DATES[file_format])
    return out.getvalue()


def _words(figure: Figure, review_set: ReviewSet, data: Mapping[str, Any], title: str) -> None:
    """Title at the top, status of the data at the foot."""
    high, wide = figure.get_figheight(), figure.get_figwidth()
    figure.text(0.25 / wide, 1 - 0.32 / high, f"{review_set.well.name}: {title}", fontsize=11, weight="bold", color=INK)
    foot = "\n".join(line for said in status(review_set, data) for line in wrap(said, int(wide * LETTERS)))
    figure.text(0.25 / wide, 0.12 / high, foot, fontsize=6, color=SOFT, va="bottom", linespacing=1.35)


def _legend(figure: Figure, points: Sequence[Point], handles: Sequence[Any], labels: Sequence[str]) -> None:
    marks, names = legend_marks((point[2] for point in points), limits=any(point[3] is not None for point in points))
    wide = figure.get_figwidth()
    figure.legend(
        [*marks, *handles], [*names, *labels], loc="lower left", bbox_to_anchor=(0.2 / wide, 0.62 / figure.get_figheight()),
        ncols=max(1, int(wide / 2.05)), frameon=False, fontsize=6.5, labelcolor=INK, handletextpad=0.4, columnspacing=1.2,
        borderpad=0, borderaxespad=0,
    )  # fmt: skip


def status(review_set: ReviewSet, data: Mapping[str, Any]) -> list[str]:
    """What the data are: set, signed or not, as of when, and checked by which rules."""
    return [
        f"Project {review_set.project.name}, well {review_set.well.name}, review set {review_set.number}; {_signed(data)}",
        f"Data as of {_as_of(review_set)}; {_checked(review_set)}",
    ]


def _signed(data: Mapping[str, Any]) -> str:
    counts, signature = data["counts"], data["signature"]
    said = ", ".join(f"{counts[verdict]} {verdict}" for verdict in ("accepted", "rejected", "held", "undecided"))
    if signature is None:
        return f"NOT SIGNED: {said}"
    return f"signed by {signature['by']}, {signature['at']:%Y-%m-%d %H:%M} UTC, seal {signature['seal'][:12]}: {said}"


def _as_of(review_set: ReviewSet) -> str:
    """When the last report came in, and when the last decision was made."""
    came = results_of(review_set).aggregate(at=Max("analysis__report__imported_at"))["at"]
    decided = Decision.objects.filter(review_set=review_set).aggregate(at=Max("decided_at"))["at"]
    last = max((at for at in (came, decided) if at), default=None)
    return f"{last:%Y-%m-%d %H:%M} UTC" if last else "no report"


def _checked(review_set: ReviewSet) -> str:
    run = QcRun.objects.filter(wells=review_set.well).select_related("rule_set").order_by("-pk").first()
    return f"rule set {run.rule_set.name} version {run.rule_set.version}, QC run {run.pk}" if run else "no QC has run"
