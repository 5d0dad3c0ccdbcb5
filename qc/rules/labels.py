"""Context labels beside results: quality class, kerogen type, maturity stage, each by a named scheme.

A label is context, never a verdict. Lower bounds belong to the class ([a, b)). A table with gaps answers "between" two
classes there. Rows as in Peters & Cassa 1994, AAPG Memoir 60, chapter 5, are from memory; check before quoting.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Final

PETERS_CASSA: Final = "peters_cassa_1994"
TMAX_ZONES: Final = "aapg_wiki_tmax"
PI_ZONES: Final = "aapg_wiki_pi"
D7708: Final = "astm_d7708"
JARVIE: Final = "jarvie_2007"
SOURCES: Final[Mapping[str, str]] = {
    PETERS_CASSA: "Peters & Cassa 1994, AAPG Memoir 60, chapter 5 (from memory)",
    TMAX_ZONES: "AAPG Wiki «Tmax»",
    PI_ZONES: "AAPG Wiki «Production Index (PI)»",
    D7708: "standards catalogue page of ASTM D7708",
    JARVIE: "Jarvie et al. 2005 and 2007 (from memory)",
}


@dataclass(frozen=True)
class Label:
    """A class by a scheme; ``caution`` says what it does not hold for, empty where nothing is known against it."""

    text: str
    scheme: str
    caution: str = ""


Steps = tuple[tuple[float, str], ...]
QUALITY: Final[Mapping[str, Steps]] = {
    "TOC": ((0.0, "poor"), (0.5, "fair"), (1.0, "good"), (2.0, "very good"), (4.0, "excellent")),
    "S1": ((0.0, "poor"), (0.5, "fair"), (1.0, "good"), (2.0, "very good"), (4.0, "excellent")),
    "S2": ((0.0, "poor"), (2.5, "fair"), (5.0, "good"), (10.0, "very good"), (20.0, "excellent")),
    "BITUMEN": ((0.0, "poor"), (500.0, "fair"), (1000.0, "good"), (2000.0, "very good"), (4000.0, "excellent")),  # ug/g
    "HYDROCARBONS": ((0.0, "poor"), (300.0, "fair"), (600.0, "good"), (1200.0, "very good"), (2400.0, "excellent")),  # ug/g
}  # fmt: skip
KEROGEN: Final[Mapping[str, Steps]] = {
    "HI": ((0.0, "IV"), (50.0, "III"), (200.0, "II/III"), (300.0, "II"), (600.0, "I")),
    "S2S3": ((0.0, "IV"), (1.0, "III"), (5.0, "II/III"), (10.0, "II"), (15.0, "I")),
    "HC_ATOMIC": ((0.0, "IV"), (0.7, "III"), (1.0, "II/III"), (1.2, "II"), (1.5, "I")),
}
PRODUCT: Final = {"I": "oil", "II": "oil", "II/III": "oil and gas", "III": "gas", "IV": "none"}
# the table has no row between the two classes named in a "between" step
MATURITY: Final[Mapping[str, Steps]] = {
    "RO": ((0.2, "immature"), (0.6, "early"), (0.65, "peak"), (0.9, "late"), (1.35, "post")),
    "TMAX": ((0.0, "immature"), (435.0, "early"), (445.0, "peak"), (450.0, "late"), (470.0, "post")),
    "TAI": ((1.5, "immature"), (2.6, "early"), (2.7, "peak"), (2.9, "late"), (3.3, "post")),
    "BITUMEN_TOC": ((0.0, "immature"), (0.05, "early"), (0.10, "between early and peak"), (0.15, "peak"), (0.25, "beyond peak")),
    "PI": ((0.0, "immature"), (0.10, "early"), (0.15, "between early and peak"), (0.25, "peak"), (0.40, "late")),
}  # fmt: skip
D7708_STEPS: Final[Steps] = ((0.0, "immature"), (0.5, "mature"), (1.35, "overmature"))
JARVIE_STEPS: Final[Steps] = ((0.0, "immature"), (0.55, "oil"), (1.15, "condensate and wet gas"), (1.40, "dry gas"))
TMAX_STEPS: Final[Mapping[str, Steps]] = {
    "II": ((0.0, "immature"), (435.0, "oil"), (455.0, "gas")),
    "III": ((0.0, "immature"), (435.0, "oil"), (465.0, "gas")),
}
PI_STEPS: Final[Steps] = ((0.0, "immature"), (0.10, "oil"), (0.30, "gas or cracking"))


def step_of(value: float, steps: Steps) -> str:
    """The class whose lower bound is the last one not above ``value``; '' below the first and for NaN."""
    found = ""
    for lower, name in steps:
        if value >= lower:
            found = name
    return found


def quality(code: str, value: float, *, maturity: str = "", contaminated: bool = False) -> Label:
    """Class of richness by TOC [wt%], S1, S2 [mg/g], BITUMEN or HYDROCARBONS [ug/g]. Raises KeyError for another code."""
    return Label(
        step_of(value, QUALITY[code]), PETERS_CASSA, _caution(maturity, contaminated=contaminated, what="richness")
    )


def kerogen(code: str, value: float, *, toc: float, maturity: str = "", contaminated: bool = False) -> Label:
    """Kerogen type by HI [mg/g TOC], S2S3 or HC_ATOMIC; of mature rock the present-day HI class.

    ``toc`` [wt%] below 0.5 (or unknown) gives no label.
    """
    if not toc >= 0.5:
        return Label("", PETERS_CASSA, "TOC below 0.5 wt% or unknown: no kerogen type")
    found = step_of(value, KEROGEN[code])
    caution = _caution(maturity, contaminated=contaminated, what="kerogen type")
    if found and maturity not in {"", "immature"}:
        return Label(f"present-day {'HI' if code == 'HI' else code} class {found}", PETERS_CASSA, caution)
    return Label(f"Type {found}" if found else "", PETERS_CASSA, caution)


def product(kerogen_type: str) -> str:
    """What the kerogen makes at peak maturity; '' for a type the scheme does not have."""
    return PRODUCT.get(kerogen_type, "")


def maturity(code: str, value: float) -> Label:
    """Stage by RO [%], TMAX [degC], TAI, BITUMEN_TOC [fraction] or PI [fraction]. Raises KeyError for another code."""
    return Label(step_of(value, MATURITY[code]), PETERS_CASSA, _of_index(code))


def reflectance_stage(ro: float, scheme: str) -> Label:
    """Stage by Ro [%] in ``D7708``, ``JARVIE`` or ``PETERS_CASSA``. Raises ValueError for another scheme."""
    steps = {D7708: D7708_STEPS, JARVIE: JARVIE_STEPS, PETERS_CASSA: MATURITY["RO"]}.get(scheme)
    if steps is None:
        raise ValueError(f"no reflectance stages by scheme {scheme!r}; there are {D7708}, {JARVIE} and {PETERS_CASSA}")
    return Label(step_of(ro, steps), scheme)


def tmax_zone(tmax: float, kerogen_type: str) -> Label:
    """Zone of generation by Tmax [degC] for kerogen II or III; none for other types, of which Tmax says little."""
    steps = TMAX_STEPS.get(kerogen_type)
    if steps is None:
        return Label("", TMAX_ZONES, "Tmax is not reliable for Type I or high-sulfur kerogen")
    return Label(step_of(tmax, steps), TMAX_ZONES)


def pi_zone(pi: float) -> Label:
    """Zone by production index [fraction]."""
    return Label(step_of(pi, PI_STEPS), PI_ZONES, _of_index("PI"))


def _of_index(code: str) -> str:
    return "free hydrocarbons that are not the rock's own mislead" if code in {"PI", "BITUMEN_TOC"} else ""


def _caution(stage: str, *, contaminated: bool, what: str) -> str:
    """What speaks against reading the class as that of the immature rock."""
    said = []
    if contaminated:
        said.append("a contamination rule fired")
    if stage not in {"", "immature"}:
        said.append(f"the rock is not immature ({stage}): {what} is that left today")
    return "; ".join(said)
