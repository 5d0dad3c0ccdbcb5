"""Depth follows sample number."""

import re

import numpy as np
import pandas as pd

from qc.rules import fits
from qc.rules.rule import CANNOT_EVALUATE, FIRE, INFO, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule
from qc.rules.spans import Floats
from qc.rules.table import Table

_NUMBER = re.compile(r"^(.*?)(\d+)\D*$")
AROUND = 5  # neighbours either side from which a row's place is predicted


def check(table: Table, *, reversed_max: float, samples_min: int) -> Answer:
    """Within each well, kind and label prefix: one check a numbered sample, or one finding for another numbering."""
    samples = table.samples()
    outcome = pd.Series(CANNOT_EVALUATE, index=samples.index, dtype=object)
    findings: list[Finding] = []
    for _, group in _numbered(samples).groupby(["well", "kind", "prefix"], sort=True):
        if len(group) < samples_min:
            outcome[group.index] = NOT_APPLICABLE
            continue
        wrong = _out_of_order(group["number"].to_numpy(dtype=float), group["top_m"].to_numpy(dtype=float))
        outcome[group.index] = PASS
        findings_here = [_finding(group, at) for at in wrong]
        lone_slip = len(wrong) == 1 and bool(findings_here[0].more["suggestion"])
        if len(wrong) > reversed_max * len(group) and not lone_slip:
            outcome[group.index] = NOT_APPLICABLE
            outcome[group.index[0]] = FIRE
            findings.append(_another_numbering(group, len(wrong)))
            continue
        outcome[group.index[wrong]] = FIRE
        findings += findings_here
    return Answer(outcome, findings)


def _numbered(samples: pd.DataFrame) -> pd.DataFrame:
    """Samples with a depth and a label that ends in a number, in the order of their numbers."""
    parts = samples["label"].astype(str).str.extract(_NUMBER)
    kept = samples.assign(prefix=parts[0], number=pd.to_numeric(parts[1].str[:15], errors="coerce"))
    kept = kept[kept["number"].notna() & kept["top_m"].notna()]
    return kept.sort_values(["well", "kind", "prefix", "number", "top_m"], kind="stable")


def _out_of_order(number: Floats, depth: Floats) -> list[int]:
    """Positions that break the order; of two that reverse, the one farther from the local line is taken.

    Depth may rise or fall with number, whichever most neighbours do.
    """
    steps = np.diff(depth)
    sign = 1.0 if np.count_nonzero(steps > 0) >= np.count_nonzero(steps < 0) else -1.0
    wrong: list[int] = []
    for at in np.nonzero(sign * steps < 0)[0]:
        pair = (int(at), int(at) + 1)
        if not set(pair) & set(wrong):
            wrong.append(max(pair, key=lambda place: (_off_line(number, depth, place, wrong), place)))
    return wrong


def _off_line(number: Floats, depth: Floats, at: int, wrong: list[int]) -> float:
    """Distance from the Theil-Sen line of the neighbourhood [m]."""
    places = [place for place in range(max(0, at - AROUND), min(len(depth), at + AROUND + 1)) if place not in wrong]
    line = fits.theil_sen(number[places], depth[places])
    return abs(depth[at] - line.slope * number[at] - line.intercept) if np.isfinite(line.slope) else 0.0


def suggestion(text: str, low: float, high: float, expected: float) -> str:
    """The reading of ``text`` with two neighbouring digits exchanged, or one replaced, that fits between two depths.

    An exchange is preferred to a replacement, then what is nearest to ``expected``; empty when none fits.
    """
    swaps = [text[:i] + text[i + 1] + text[i] + text[i + 2 :] for i in range(len(text) - 1)]
    edits = [text[:i] + digit + text[i + 1 :] for i in range(len(text)) for digit in "0123456789"]
    for tries in (swaps, edits):
        fitting = [one for one in tries if one != text and _number(one) is not None and low <= float(one) <= high]
        if fitting:
            return min(fitting, key=lambda one: (abs(float(one) - expected), one))
    return ""


def _number(text: str) -> float | None:
    return float(text) if re.fullmatch(r"\d+(\.\d+)?", text) else None


def _finding(group: pd.DataFrame, at: int) -> Finding:
    row, top = int(group.index[at]), float(group["top_m"].iloc[at])
    before = float(group["top_m"].iloc[at - 1]) if at else -np.inf
    after = float(group["top_m"].iloc[at + 1]) if at + 1 < len(group) else np.inf
    text = f"Sample {group['label'].iloc[at]} at {top:.2f} m breaks the order of depths by sample number ({before:.2f}, {after:.2f} m beside it)"
    likely = ""
    if np.isfinite(before) and np.isfinite(after):
        reported = str(group["top_text"].iloc[at]).replace(",", "").strip() or f"{top:g}"
        unit = top / float(reported) if _number(reported) and float(reported) else 1.0
        low, high = sorted((before / unit, after / unit))
        likely = suggestion(reported, low, high, (low + high) / 2)
    if likely:
        text += f"; {likely} would fit, from {reported} by a slip of digits"
    more = {
        "suggestion": likely,
        "alternatives": ["digits exchanged in the depth", "labels of two samples exchanged"],
        "discriminating_test": "compare with the sample list of the well",
    }
    limit = [None if not np.isfinite(end) else end for end in (before, after)]
    return Finding(row, "", WARN, text + ".", (), top, limit, more=more)


def _another_numbering(group: pd.DataFrame, wrong: int) -> Finding:
    text = f"Sample numbers «{group['prefix'].iloc[0]}…» do not follow depth ({wrong} of {len(group)} reversed): another numbering."
    more = {"alternatives": ["numbered by another order"], "discriminating_test": "ask how the samples were numbered"}
    rows = tuple(int(row) for row in group.index)
    return Finding(None, "", INFO, text, (), wrong, len(group), rows=rows, more=more)


RULE = Rule(
    id="sample_sequence",
    family="depth",
    title="Depth follows sample number",
    tests="Samples are numbered as they are taken: a depth that breaks the order is often a slip of digits.",
    check=check,
    inputs=("sample label", "top"),
    flags="the sample",
    formula="adjacent reversals of depth by sample number in at most 5 % of the rows, or a single one that a slip of digits explains",
    message="The depth breaks the order of sample numbers",
    source="our default, no publication",
    must_not_fire="Row by row where more than 5 % reverse: then one note says that numbering follows another order.",
    example="Samples 41, 42, 43 at 2510, 2250, 2530: 42 fires, suggestion 2520.",
)
