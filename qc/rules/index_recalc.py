"""Reported indices must follow from reported peaks."""

from dataclasses import dataclass, replace

import numpy as np
import pandas as pd

from qc.rules.rule import PASS, REJECT, WARN, Answer, Finding, Rule, fired, judge, merge, say
from qc.rules.spans import Bools, Span, censored, line, num, reported, span
from qc.rules.table import Table

SLIPS = (100.0, 10.0, 0.1, 0.01)


@dataclass(frozen=True)
class Index:
    """An index and the values it is made of; ``scale * top / bottom`` unless it has a form of its own."""

    code: str
    top: str
    bottom: str
    scale: float = 1.0


INDICES = (
    Index("HI", "S2", "TOC", 100), Index("OI", "S3", "TOC", 100), Index("OSI", "S1", "TOC", 100),
    Index("PI", "S1", "S2"), Index("S2S3", "S2", "S3"), Index("GP", "S1", "S2"),
)  # fmt: skip


def allowed(rows: pd.DataFrame, index: Index, bottom: str, *, rounded: bool = True) -> Span:
    """What the unrounded inputs allow; NaN where an input is missing or the divisor may be zero.

    PI rises with S1 and falls with S2, so its ends take opposite ends of the two.
    """
    a, b = span(rows, index.top, rounded=rounded), span(rows, bottom, rounded=rounded)
    if index.code == "GP":
        return a + b
    if index.code == "PI":
        with np.errstate(invalid="ignore", divide="ignore"):
            lo = np.maximum(a.lo, 0) / (np.maximum(a.lo, 0) + b.hi)
            hi = a.hi / (a.hi + np.maximum(b.lo, 0))
        return Span(lo, hi)
    return a.over(b, index.scale)


def recomputed(rows: pd.DataFrame, index: Index, bottom: str) -> np.ndarray:
    """The index from the numbers as they stand."""
    return allowed(rows, index, bottom, rounded=False).hi


def check(table: Table, *, slip_tolerance: float) -> Answer:
    """One check for each reported index of each pyrolysis row: do the allowed and the reported interval overlap?"""
    rows = table.of("pyrolysis")
    answers = {index.code: _check(rows, index, slip_tolerance) for index in INDICES}
    passing = {code: set(answer.outcome.index[answer.outcome == PASS]) for code, answer in answers.items()}
    failing: dict[int, set[str]] = {}
    for code, answer in answers.items():
        for finding in answer.findings:
            failing.setdefault(_row(finding), set()).add(code)
    told = merge(list(answers.values()))
    blamed = {
        row: suspects(codes, {code for code in passing if row in passing[code]}) for row, codes in failing.items()
    }
    return replace(told, findings=[_with_suspects(finding, blamed[_row(finding)]) for finding in told.findings])


def suspects(failing: set[str], passing: set[str]) -> list[str]:
    """The values any one of which explains why these indices fail and those hold.

    An input that every failing index shares and no holding one has; and the index itself where it alone fails.
    """
    made_of = {index.code: {index.top, index.bottom} for index in INDICES}
    sound = set().union(*(made_of[code] for code in passing))
    shared = set.intersection(*(made_of[code] for code in failing)) - sound
    return [*(failing if len(failing) == 1 else ()), *sorted(shared)]


def _row(finding: Finding) -> int:
    return -1 if finding.row is None else finding.row


def _with_suspects(finding: Finding, names: list[str]) -> Finding:
    text = finding.message
    if 1 <= len(names) <= 2:
        text += f" The other indices of the sample point to {' or '.join(names)}."
    return replace(finding, message=text, more={**finding.more, "suspects": names})


def _check(rows: pd.DataFrame, index: Index, slip_tolerance: float) -> Answer:
    given = span(rows, index.code, rounded=True)
    spans = {bottom: allowed(rows, index, bottom) for bottom in _bottoms(index)}
    meets = {bottom: one.meets(given) for bottom, one in spans.items()}
    known = given.known & np.logical_or.reduce([one.known for one in spans.values()])
    bounds = censored(rows, index.top) | censored(rows, index.bottom) | censored(rows, index.code)
    found = np.logical_or.reduce(list(meets.values()))
    sure = known & ~(bounds & found)
    applies = reported(rows, index.code) & ~_divisor_within_rounding(rows, index)
    outcome = judge(rows.index, applies=applies, known=sure, fires=known & ~found)
    facts = _facts(rows, index, given, spans)
    return Answer(outcome, [_finding(rows, row, index, line(facts, row), slip_tolerance) for row in fired(outcome)])


def _facts(rows: pd.DataFrame, index: Index, given: Span, spans: dict[str, Span]) -> pd.DataFrame:
    """What a finding tells, a row: the ends of both intervals, the divisor used, whether HI and OI look swapped."""
    made = pd.DataFrame(
        {"given_lo": given.lo, "given_hi": given.hi, "swapped": _swapped(rows, index, given)}, index=rows.index
    )
    made["bottom"], made["lo"], made["hi"] = index.bottom, np.nan, np.nan
    for bottom, one in reversed(spans.items()):
        made["bottom"] = np.where(one.known, bottom, made["bottom"])
        made["lo"], made["hi"] = np.where(one.known, one.lo, made["lo"]), np.where(one.known, one.hi, made["hi"])
    return made


def _bottoms(index: Index) -> tuple[str, ...]:
    """The index may have been made with the TOC of a separate carbon analysis: whichever reproduces it counts."""
    return (index.bottom, "TOC_CARBON") if index.bottom == "TOC" else (index.bottom,)


def _divisor_within_rounding(rows: pd.DataFrame, index: Index) -> Bools:
    """Rows whose divisor is within half a unit of zero: any index is possible there."""
    if index.code in {"GP", "PI"}:
        return np.zeros(len(rows), dtype=bool)
    bottom = span(rows, index.bottom, rounded=True)
    with np.errstate(invalid="ignore"):
        return (bottom.lo <= 0) & ~censored(rows, index.bottom)


def _swapped(rows: pd.DataFrame, index: Index, given: Span) -> Bools:
    """Where HI is what OI should be, or OI what HI should be."""
    other = {"HI": INDICES[1], "OI": INDICES[0]}.get(index.code)
    if other is None:
        return np.zeros(len(rows), dtype=bool)
    return allowed(rows, other, other.bottom).meets(given)


def _finding(rows: pd.DataFrame, row: int, index: Index, fact: pd.Series, slip_tolerance: float) -> Finding:
    bottom, swapped = str(fact["bottom"]), bool(fact["swapped"])
    value = num(rows, row, index.code)
    exactly = float(recomputed(rows.loc[[row]], index, bottom)[0])
    slip = _slip(value, exactly, slip_tolerance)
    inputs = tuple(dict.fromkeys((index.code, index.top, index.bottom, bottom)))
    text = (
        f"{index.code} is reported as {say(value)}, but {index.top} and {index.bottom} allow "
        f"{say(fact['lo'])} to {say(fact['hi'])}"
    )
    if slip:
        text += f"; it is {say(slip)} times what they give, as a slip of unit or decimal point would be"
    if swapped:
        text += f"; it is what {'OI' if index.code == 'HI' else 'HI'} should be, as if the two columns were swapped"
    more = {
        "allowed": [round(float(fact["lo"]), 6), round(float(fact["hi"]), 6)],
        "reported": [round(float(fact["given_lo"]), 6), round(float(fact["given_hi"]), 6)],
        "recomputed_with": bottom,
        "half_units": {name: num(rows, row, f"{name}_h") for name in inputs if num(rows, row, f"{name}_id") >= 0},
        "decimals_because": "largest number of decimals in the column of the report, or of its batch",
        "alternatives": [
            "index made from another TOC, from unrounded, blank-corrected or averaged values", "slip in the index",
            "slip in one of its inputs",
        ],
        "discriminating_test": "ask the laboratory for the raw peaks and the TOC used",
    }  # fmt: skip
    return Finding(
        row, index.code, REJECT if slip or swapped else WARN, text + ".", inputs, round(exactly, 6), more["allowed"],
        more=more,
    )  # fmt: skip


def _slip(value: float, exactly: float, tolerance: float) -> float:
    """The power of ten by which the reported index is off, or 0."""
    if not exactly > 0 or not value > 0:
        return 0.0
    return next((slip for slip in SLIPS if abs(value / exactly / slip - 1) <= tolerance), 0.0)


RULE = Rule(
    id="index_recalc",
    family="arithmetic",
    title="Indices follow from their peaks",
    tests="Each reported HI, OI, PI, OSI, S2/S3 and S1+S2 is computed again from the reported peaks and TOC.",
    check=check,
    inputs=("S1", "S2", "S3", "TOC", "HI", "OI", "PI", "OSI", "S2S3", "GP"),
    flags="the index",
    formula=(
        "HI = 100 S2/TOC; OI = 100 S3/TOC; PI = S1/(S1+S2); OSI = 100 S1/TOC; S2/S3; GP = S1+S2. Fires when the interval "
        "that the unrounded inputs allow and the reported index ± half a unit of its last decimal do not overlap."
    ),
    message="The reported index does not follow from the reported peaks",
    source=(
        "interval arithmetic (our default, no publication); PI: AAPG Wiki «Production Index (PI)»; OI: AAPG Wiki on "
        "hydrogen and oxygen index; HI and OSI from memory of Espitalié et al. 1977 and Jarvie 2012, AAPG Memoir 97"
    ),
    must_not_fire=(
        "When the divisor is within rounding of zero; when the TOC of a separate carbon analysis reproduces the index; "
        "when a censored input leaves both conclusions open."
    ),
    example=(
        "TOC 0.87, S2 3.47, HI 399: allowed 396.00-401.73, passes. S1 0.12, S2 3.47: PI 0.03 passes, PI 0.04 fires. "
        "TOC 0.2, S2 0.4 at one decimal allow HI 140-300, so 160 passes."
    ),
)
