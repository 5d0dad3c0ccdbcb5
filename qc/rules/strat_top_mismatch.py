"""The formation stated is the formation at that depth."""

import re
from typing import Any

import pandas as pd

from qc.rules.rule import CANNOT_EVALUATE, FIRE, NOT_APPLICABLE, PASS, WARN, Answer, Finding, Rule
from qc.rules.table import IDENTITY, Table

_RANKS = re.compile(r"\b(?:formation|fm|member|mbr|group|gp|shale|sh)\b\.?", re.IGNORECASE)


def plain(name: str) -> str:
    """``Mowry Shale`` -> ``mowry``: names compare without their rank."""
    return " ".join(re.sub(r"[^0-9a-z]+", " ", _RANKS.sub(" ", name).casefold()).split())


def check(table: Table, *, tolerance: float) -> Answer:
    """One check for each sample with a stated formation. A name that the tops do not hold may be an alias: not judged."""
    samples = table.samples()[list(IDENTITY)]  # without the analytes, whose many columns make each row slow
    outcome = pd.Series(NOT_APPLICABLE, index=samples.index, dtype=object)
    findings: list[Finding] = []
    stated = samples[samples["formation"].ne("")]
    outcome[stated.index] = CANNOT_EVALUATE
    for well, group in stated.groupby("well", sort=True):
        tops = current(table.tops, well)
        if tops.empty:
            continue
        for row in group.index:
            outcome[row], found = _outcome(group.loc[row], tops, tolerance)
            if outcome[row] == FIRE:
                findings.append(_finding(group.loc[row], int(row), tops, found))
    return Answer(outcome, findings)


def current(tops: pd.DataFrame, well: Any) -> pd.DataFrame:
    """The well's tops of the last version, from the top down."""
    own = tops[tops["well"] == well]
    if own.empty:
        return own
    last = max(
        own["version"],
        key=lambda version: [
            (part.isdigit(), int(part) if part.isdigit() else 0, part) for part in re.split(r"(\d+)", str(version))
        ],
    )
    return own[own["version"] == last].sort_values(["top_m", "name"], kind="stable")


def formations(tops: pd.DataFrame, top_m: float, base_m: float) -> list[str]:
    """Names between two depths: the one in force at the top and those that begin before the base."""
    above = tops[tops["top_m"] <= top_m]["name"].tail(1)
    within = tops[(tops["top_m"] > top_m) & (tops["top_m"] <= base_m)]["name"]
    return [*above, *within]


def _outcome(sample: pd.Series, tops: pd.DataFrame, tolerance: float) -> tuple[str, list[str]]:
    if pd.isna(sample["top_m"]) or sample["depth_kind"] == "TVD":
        return CANNOT_EVALUATE, []
    name = plain(sample["formation"])
    if name not in {plain(one) for one in tops["name"]}:
        return CANNOT_EVALUATE, []
    base = sample["top_m"] if pd.isna(sample["base_m"]) else sample["base_m"]
    found = formations(tops, sample["top_m"] - tolerance, base + tolerance)
    return (PASS if name in {plain(one) for one in found} else FIRE), found


def _finding(sample: pd.Series, row: int, tops: pd.DataFrame, found: list[str]) -> Finding:
    own = tops[tops["name"].map(plain) == plain(sample["formation"])]["top_m"].iloc[0]
    here = ", ".join(found) or "above the first top"
    text = f"The sample at {sample['top_m']:.2f} m is labelled {sample['formation']}, which starts at {own:.2f} m; the tops have {here} there."
    more = {
        "tops": [
            [str(name), float(top)] for name, top in zip(tops["name"].head(20), tops["top_m"].head(20), strict=True)
        ],
        "tops_version": str(tops["version"].iloc[0]),
        "alternatives": ["depth slip", "label from another version of the tops", "caved material named for its origin"],
        "discriminating_test": "check the depth against the sample list and the tops version used",
    }
    return Finding(row, "", WARN, text, (), float(sample["top_m"]), float(own), more=more)


RULE = Rule(
    id="strat_top_mismatch",
    family="depth",
    title="Formation and depth agree",
    tests="The formation stated with a sample is compared with the formation tops of the well.",
    check=check,
    inputs=("formation", "top", "base", "formation tops"),
    flags="the sample",
    formula="stated formation not among those of the tops within the interval ± 2 m",
    message="The stated formation is not the one at this depth",
    source="our default, no publication",
    must_not_fire="On names that the tops do not hold (an alias; cannot be evaluated).",
    example="Top X at 2500, a sample at 2480 labelled X fires.",
)
