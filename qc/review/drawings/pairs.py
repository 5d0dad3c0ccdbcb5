"""One value against another. A point shows the graver state of its two values, as on the page."""

from collections.abc import Mapping, Sequence
from typing import Any

from matplotlib.axes import Axes

from qc.review import figures
from qc.review.drawings.marks import DOWN, LEFT, RIGHT, UP, Point, stamp
from qc.review.drawings.points import Column
from qc.review.drawings.tracks import GRID, INK, SOFT


def plan(x: Column, y: Column) -> figures.CrossPlot:
    """How the trade draws this pair; any other plainly."""
    codes = (x.sent["analyte"], y.sent["analyte"])
    for plot in figures.CROSSPLOTS:
        if codes == (plot.x, plot.y):
            return plot
    return figures.CrossPlot(*codes, f"{y.sent['label']} – {x.sent['label']}")


def draw_pair(axes: Axes, data: Mapping[str, Any], x: Column, y: Column) -> list[Point]:
    """Draw the pair with its fits. Returns the points drawn."""
    plot = plan(x, y)
    _frame(axes, x, y, plot)
    if plot.fit:
        for fit in data["fits"]:
            _fit(axes, fit, (x.low, x.high))
    points = _points(x, y, plot)
    stamp(axes, points)
    return points


def _frame(axes: Axes, x: Column, y: Column, plot: figures.CrossPlot) -> None:
    if x.log:
        axes.set_xscale("log")
    if y.log:
        axes.set_yscale("log")
    axes.set_xlim(*(reversed(x.ends) if plot.invert_x else x.ends))
    axes.set_ylim(*(reversed(y.ends) if plot.invert_y else y.ends))
    axes.set_xlabel(x.label, fontsize=8, color=INK)
    axes.set_ylabel(y.label, fontsize=8, color=INK)
    axes.tick_params(labelsize=7, length=3, color=SOFT)
    axes.grid(visible=True, color=GRID, linewidth=0.5)
    axes.set_axisbelow(True)
    for spine in axes.spines.values():
        spine.set_color(SOFT)
        spine.set_linewidth(0.6)


def _points(x: Column, y: Column, plot: figures.CrossPlot) -> list[Point]:
    points: list[Point] = []
    for row in range(len(x.states)):
        across, along = x.at(row), y.at(row)
        if across is None or along is None:
            continue
        way = _way(across[1], along[1], plot)
        points.append((across[0], along[0], max(x.states[row], y.states[row]), way))
    return points


def _way(across: int, along: int, plot: figures.CrossPlot) -> int | None:
    """Which way the value lies: along y first; turned round with the axis."""
    if along:
        return UP if (along > 0) != plot.invert_y else DOWN
    if across:
        return RIGHT if (across > 0) != plot.invert_x else LEFT
    return None


def _fit(axes: Axes, fit: Mapping[str, Any], view: Sequence[float]) -> None:
    """The line, and between the ends of slope and intercept its interval."""
    slope, intercept, ends = fit["slope"], fit["intercept"], fit["span"] or list(view)
    interval = fit["interval"]
    if isinstance(interval, dict) and interval.get("slope") and interval.get("intercept"):
        low = [interval["slope"][0] * at + interval["intercept"][1] for at in ends]
        high = [interval["slope"][1] * at + interval["intercept"][0] for at in ends]
        axes.fill_between(ends, low, high, color=figures.FIT, alpha=0.14, linewidth=0, zorder=2)
    start = -intercept / slope if slope else ends[0]
    name = f"S2 = {slope:.3g} TOC {'−' if intercept < 0 else '+'} {abs(intercept):.3g}"
    about = ", ".join(part for part in (fit["unit"], f"n = {fit['n']}" if fit["n"] else "") if part)
    axes.plot(
        [start, max(ends)], [0, slope * max(ends) + intercept], color=figures.FIT, linewidth=1.2, zorder=3,
        label=f"{name}{f' ({about})' if about else ''}",
    )[0].set_gid("fit")  # fmt: skip
