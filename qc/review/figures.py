"""How results are drawn, on the review page and in reports: palette, markers, labels, units, order and axes.

Colours are of Okabe & Ito's palette, which colour-blind readers tell apart; every state has a marker of its own as
well, so that colour is never the only sign.
"""

from dataclasses import asdict, dataclass
from typing import Any

from qc.models import Verdict

FLAGGED = "flagged"
COMPUTED = "computed"
#: rank of a point made of two values: the graver state is shown
STATES = (
    COMPUTED,
    Verdict.ACCEPTED.value,
    Verdict.UNDECIDED.value,
    FLAGGED,
    Verdict.HELD.value,
    Verdict.REJECTED.value,
)


@dataclass(frozen=True)
class Marker:
    """How a state is drawn: marker name of the canvas layer, its matplotlib twin, colour, label and text sign."""

    shape: str
    twin: str
    colour: str
    label: str
    sign: str


MARKERS = {
    COMPUTED: Marker("square", "s", "#56b4e9", "computed, not decided on", "□"),
    Verdict.ACCEPTED.value: Marker("disc", "o", "#009e73", "accepted", "●"),
    Verdict.UNDECIDED.value: Marker("ring", "o", "#4f5a5b", "undecided", "○"),
    FLAGGED: Marker("triangle", "^", "#a8487d", "flagged, undecided", "▲"),
    Verdict.HELD.value: Marker("half", "o", "#b87f00", "held", "◐"),
    Verdict.REJECTED.value: Marker("cross", "x", "#d55e00", "rejected", "✕"),
}
SELECTED = "#0072b2"
BANDS = {
    "core": "#1b2526", "casing": "#1b2526", "top": "#74827f", "mud_water": "#56b4e9", "mud_oil": "#e69f00",
    "mud_synthetic": "#cc79a7", "mud_air": "#ccd6d2", "unit": ("#ffffff", "#f2f5f3"),
}  # fmt: skip
FIT = "#0072b2"


@dataclass(frozen=True)
class Axis:
    """How an analyte is drawn: name, log or linear, from zero or from its lowest value."""

    label: str
    log: bool = False
    zero: bool = True


AXES = {
    "TOC": Axis("TOC"), "S1": Axis("S1"), "S2": Axis("S2"), "S3": Axis("S3"), "TMAX": Axis("Tmax", zero=False),
    "HI": Axis("HI"), "OI": Axis("OI"), "PI": Axis("PI"), "OSI": Axis("OSI"), "RO": Axis("Ro", zero=False),
    "KAIR": Axis("k air", log=True, zero=False), "KLINK": Axis("k Klinkenberg", log=True, zero=False),
    "PHI": Axis("φ"), "RHOG": Axis("ρ grain", zero=False), "RHOB": Axis("ρ bulk", zero=False),
    "D13C_ORG": Axis("δ13C org", zero=False), "D13C_CARB": Axis("δ13C carb", zero=False),
    "D18O_CARB": Axis("δ18O carb", zero=False), "D34S": Axis("δ34S", zero=False), "GR": Axis("gamma"),
}  # fmt: skip
UNITS = {"degC": "°C", "permil": "‰", "fraction": "fraction", "ug/g": "µg/g", "g/cm3": "g/cm³"}
#: order of tracks from left to right; what is not named follows in the catalogue's order
TRACKS = ("TOC", "S1", "S2", "S3", "TMAX", "HI", "OI", "PI", "RO")
TRACKS_AT_FIRST = 10


@dataclass(frozen=True)
class CrossPlot:
    """One cross-plot: analyte along x and y, either axis turned round where the trade does so."""

    x: str
    y: str
    title: str
    invert_x: bool = False
    invert_y: bool = False
    fit: str = ""


CROSSPLOTS = (
    CrossPlot("TOC", "S2", "S2 – TOC", fit="s2_toc_fit"),
    CrossPlot("TMAX", "HI", "HI – Tmax"),
    CrossPlot("OI", "HI", "HI – OI"),
    CrossPlot("TMAX", "PI", "PI – Tmax"),
    CrossPlot("TOC", "S1", "S1 – TOC"),
)
#: indices drawn as computed where the laboratory reported none: analyte -> (numerator, denominator terms, factor)
INDICES = {
    "HI": ("S2", ("TOC",), 100.0),
    "OI": ("S3", ("TOC",), 100.0),
    "PI": ("S1", ("S1", "S2"), 1.0),
}


def axis(code: str) -> Axis:
    """How the analyte is drawn; an unnamed one linear, under its code."""
    return AXES.get(code, Axis(code.replace("_", " ")))


def unit(text: str) -> str:
    """The canonical unit as it is printed."""
    return UNITS.get(text, text)


def track_order(code: str, catalogue_order: int) -> tuple[int, int, str]:
    """Sort key of a track."""
    return (TRACKS.index(code) if code in TRACKS else len(TRACKS), catalogue_order, code)


def plain() -> dict[str, Any]:
    """All of it as plain data for the page's scripts."""
    return {
        "states": list(STATES),
        "markers": {state: {k: v for k, v in asdict(m).items() if k != "twin"} for state, m in MARKERS.items()},
        "selected": SELECTED,
        "fit": FIT,
        "bands": BANDS,
        "crossplots": [asdict(plot) for plot in CROSSPLOTS],
        "tracks_at_first": TRACKS_AT_FIRST,
    }
