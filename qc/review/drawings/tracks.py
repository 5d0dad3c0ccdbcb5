"""Depth tracks side by side: shared depth, down is deeper, what the well went through behind and beside them."""

from collections.abc import Mapping, Sequence
from typing import Any

from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from qc.review import figures
from qc.review.drawings.marks import LEFT, RIGHT, Point, stamp
from qc.review.drawings.points import Column

INK, SOFT, GRID = "#1b2526", "#4f5a5b", "#dfe6e3"
TICKS = {1: 6, 2: 5, 3: 4}


def depths(data: Mapping[str, Any]) -> list[float | None]:
    """The middle of each row's interval [m MD]; None without a depth."""
    rows = zip(data["rows"]["top"], data["rows"]["base"], strict=True)
    return [None if top is None else (top + (top if base is None else base)) / 2 for top, base in rows]


def draw_tracks(
    figure: Figure, data: Mapping[str, Any], columns: Sequence[Column], box: tuple[float, float, float, float]
) -> list[Point]:
    """Draw the tracks into ``box`` (left, bottom, right, top as shares of the page). Returns the points drawn."""
    widths = [0.62, *[1.0] * len(columns)]
    left, bottom, right, top = box
    grid = figure.add_gridspec(
        1, len(widths), width_ratios=widths, wspace=0.09, left=left, right=right, bottom=bottom, top=top
    )  # fmt: skip
    middles = depths(data)
    beside = figure.add_subplot(grid[0, 0])
    ends = _ends(data)
    _beside(beside, data["bands"], ends)
    drawn: list[Point] = []
    for n, column in enumerate(columns, start=1):
        axes = figure.add_subplot(grid[0, n])
        _frame(axes, column, ends, TICKS.get(len(columns), 3))
        _units(axes, data["bands"], ends)
        points = _points(column, middles)
        stamp(axes, points)
        drawn += points
    return drawn


def _ends(data: Mapping[str, Any]) -> tuple[float, float]:
    """Shallowest top and deepest base of the rows, with a little air."""
    tops = [top for top in data["rows"]["top"] if top is not None] or [0.0]
    bases = [base for base in data["rows"]["base"] if base is not None] or [1.0]
    low, high = min(tops), max(*bases, *tops)
    air = (high - low) * 0.015 or 1.0
    return low - air, high + air


def _points(column: Column, middles: Sequence[float | None]) -> list[Point]:
    points: list[Point] = []
    for row, depth in enumerate(middles):
        place = column.at(row)
        if place is None or depth is None:
            continue
        value, way = place
        points.append((value, depth, column.states[row], None if way == 0 else RIGHT if way > 0 else LEFT))
    return points


def _frame(axes: Axes, column: Column, ends: tuple[float, float], ticks: int) -> None:
    axes.set_ylim(ends[1], ends[0])
    if column.log:
        axes.set_xscale("log")
    else:
        axes.locator_params(axis="x", nbins=ticks)
    axes.set_xlim(*column.ends)
    axes.xaxis.tick_top()
    axes.xaxis.set_label_position("top")
    unit = "computed" if column.sent["computed"] else column.sent["unit"]
    axes.set_xlabel(f"{column.sent['label']}\n{unit}", fontsize=7, color=INK, labelpad=4)
    axes.tick_params(axis="x", labelsize=6, length=2, color=SOFT, pad=2)
    axes.tick_params(axis="y", labelleft=False, length=0)
    axes.grid(visible=True, color=GRID, linewidth=0.5)
    axes.set_axisbelow(True)
    for spine in axes.spines.values():
        spine.set_color(SOFT)
        spine.set_linewidth(0.6)


def _spans(bands: Mapping[str, Any], ends: tuple[float, float]) -> list[tuple[str, float, float]]:
    """Formations inside the depths drawn: name, top, base."""
    tops = sorted(bands["tops"], key=lambda unit: unit["top"])
    bases = [*(unit["top"] for unit in tops[1:]), ends[1]]
    spans = [
        (unit["name"], max(unit["top"], ends[0]), min(base, ends[1])) for unit, base in zip(tops, bases, strict=False)
    ]
    return [span for span in spans if span[1] < span[2]]


def _units(axes: Axes, bands: Mapping[str, Any], ends: tuple[float, float]) -> None:
    """Formations as faint bands, casing shoes and changes of mud as lines, behind the marks."""
    for n, (_, top, base) in enumerate(_spans(bands, ends)):
        axes.axhspan(top, base, facecolor=figures.BANDS["unit"][n % 2], zorder=0)
        axes.axhline(top, color=figures.BANDS["top"], linewidth=0.6, zorder=1)
    for shoe in bands["casing"]:
        if ends[0] < shoe < ends[1]:
            axes.axhline(shoe, color=INK, linewidth=0.5, linestyle=(0, (2, 3)), zorder=1)
    for mud in bands["muds"][1:]:
        if ends[0] < mud["top"] < ends[1]:
            axes.axhline(mud["top"], color="#a87200", linewidth=0.6, linestyle=(0, (6, 4)), zorder=1)


def _beside(axes: Axes, bands: Mapping[str, Any], ends: tuple[float, float]) -> None:
    """Depth, formations by name, cores, casing shoes and muds."""
    axes.set_ylim(ends[1], ends[0])
    axes.set_xlim(0, 1)
    axes.set_xticks([])
    axes.tick_params(axis="y", labelsize=6.5, length=2, color=SOFT)
    axes.set_ylabel("depth [m MD]", fontsize=7, color=INK)
    for spine in axes.spines.values():
        spine.set_color(SOFT)
        spine.set_linewidth(0.6)
    _units(axes, bands, ends)
    for name, top, base in _spans(bands, ends):
        tall = (base - top) / (ends[1] - ends[0])
        if tall > 0.02:
            axes.text(
                0.42, (top + base) / 2, name, fontsize=6, rotation=90 if tall > 0.15 else 0, ha="center", va="center",
                color=INK, clip_on=True,
            )  # fmt: skip
    for mud in bands["muds"]:
        colour = _colour(f"mud_{mud['kind']}")
        axes.fill_betweenx(
            [max(mud["top"], ends[0]), min(mud["base"], ends[1])], 0.9, 1.0, facecolor=colour, linewidth=0,
            hatch="////" if mud["kind"] == "oil" else None, edgecolor="white", clip_on=True,
        )  # fmt: skip
    for core in bands["cores"]:
        axes.fill_betweenx([core["top"], core["base"]], 0.8, 0.88, facecolor=_colour("core"), clip_on=True)
    for shoe in bands["casing"]:
        if ends[0] < shoe < ends[1]:
            axes.plot([0.06], [shoe], marker="v", markersize=5, color=INK, linestyle="none")


def _colour(name: str) -> str:
    """The colour of a band; a mud of unknown kind is drawn like air."""
    return str(figures.BANDS.get(name, figures.BANDS["mud_air"]))


def legend_bands(bands: Mapping[str, Any]) -> tuple[list[Patch | Line2D], list[str]]:
    """Handles and labels of what stands beside the tracks."""
    found: dict[str, Patch | Line2D] = {}
    if bands["cores"]:
        found["core"] = Patch(facecolor=_colour("core"))
    if bands["casing"]:
        found["casing shoe"] = Line2D([], [], linestyle="none", marker="v", markersize=5, color=INK)
    for mud in bands["muds"]:
        colour = _colour(f"mud_{mud['kind']}")
        hatch = "////" if mud["kind"] == "oil" else None
        found.setdefault(f"mud: {mud['label']}", Patch(facecolor=colour, hatch=hatch, edgecolor="white"))
    return list(found.values()), list(found)
