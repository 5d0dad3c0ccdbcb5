"""Marks of matplotlib that look like those of the page: one shape and colour a state, an open arrow for a limit."""

from collections import defaultdict
from collections.abc import Iterable
from typing import Any

from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.markers import MarkerStyle
from matplotlib.path import Path
from matplotlib.transforms import Affine2D

from qc.models import Verdict
from qc.review import figures

FILLS: dict[str, Any] = {
    "disc": "full",
    "triangle": "full",
    "half": "left",
    "ring": "none",
    "square": "none",
    "cross": "full",
}
MANY = 2000  # marks of one plot from which they are drawn as pixels in SVG and PDF
SIZE, SMALL = 4.6, 2.8
THIN = 0.6
RIGHT, UP, LEFT, DOWN = 0, 90, 180, 270
_ARROW = Path(
    [(0.5, 0), (2.2, 0), (1.55, 0.45), (2.2, 0), (1.55, -0.45)], [Path.MOVETO, Path.LINETO, Path.MOVETO, Path.LINETO, Path.LINETO]
)  # fmt: skip
Point = tuple[float, float, int, int | None]  # x, y, place in figures.STATES, way of the arrow in degrees or None


def stamp(axes: Axes, points: Iterable[Point]) -> None:
    """Draw the points, the graver state on top; rejected ones thin. Groups are named by state in the SVG."""
    groups: dict[tuple[int, int | None], list[Point]] = defaultdict(list)
    for point in points:
        groups[point[2], point[3]].append(point)
    total = sum(map(len, groups.values()))
    for (state, way), some in sorted(groups.items(), key=lambda item: (item[0][0], item[0][1] or -1)):
        xs, ys = [point[0] for point in some], [point[1] for point in some]
        name = figures.STATES[state]
        look: dict[str, Any] = {"linestyle": "none", "clip_on": False, "zorder": 4, "rasterized": total > MANY}
        [mark] = axes.plot(xs, ys, **look, **mark_of(name, small=total > MANY, hollow=way is not None))
        mark.set_gid(f"mark-{name}-{'value' if way is None else way}")
        if way is not None:
            [arrow] = axes.plot(xs, ys, **look, **arrow_of(name, way, small=total > MANY))
            arrow.set_gid(f"arrow-{name}-{way}")


def mark_of(state: str, *, small: bool = False, hollow: bool = False) -> dict[str, Any]:
    """How a state is drawn; ``hollow`` where the number is a limit."""
    marker = figures.MARKERS[state]
    rejected = state == Verdict.REJECTED.value
    filled = FILLS[marker.shape] == "full" and not hollow
    return {
        "marker": marker.twin, "markersize": SMALL if small else SIZE, "markeredgecolor": marker.colour,
        "fillstyle": FILLS[marker.shape] if not hollow and FILLS[marker.shape] == "left" else "full",
        "markerfacecolor": marker.colour if filled or FILLS[marker.shape] == "left" else "white",
        "markerfacecoloralt": "white", "markeredgewidth": THIN if rejected else 0.9,
    }  # fmt: skip


def arrow_of(state: str, way: int, *, small: bool = False) -> dict[str, Any]:
    """An open arrow that starts at the mark and points where the value lies."""
    style = MarkerStyle(_ARROW, fillstyle="none", transform=Affine2D().rotate_deg(way))
    return {
        "marker": style, "markersize": 2.4 * (SMALL if small else SIZE), "markeredgecolor": figures.MARKERS[state].colour,
        "markeredgewidth": 0.8,
    }  # fmt: skip


def legend_marks(states: Iterable[int], *, limits: bool) -> tuple[list[Line2D], list[str]]:
    """Handles and labels of the states drawn, and of the arrow where there is one."""
    names = [figures.STATES[state] for state in sorted(set(states))]
    handles = [Line2D([], [], linestyle="none", **mark_of(name)) for name in names]
    labels = [figures.MARKERS[name].label for name in names]
    if limits:
        handles.append(Line2D([], [], linestyle="none", **arrow_of(Verdict.UNDECIDED.value, LEFT)))
        labels.append("a limit, or beyond the axis: the value lies that way")
    return handles, labels
