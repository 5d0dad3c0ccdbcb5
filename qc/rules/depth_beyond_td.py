"""No sample from below the bottom of the well."""

import numpy as np
import pandas as pd

from qc.rules.rule import REJECT, Answer, Finding, Rule, fired, judge
from qc.rules.spans import line
from qc.rules.table import Table


def check(table: Table, *, tolerance: float, tolerance_relative: float) -> Answer:
    """One check a sample with a depth: its deeper end against total depth."""
    samples = table.samples()
    td = samples["well"].map(table.wells["td_m"]).to_numpy(dtype=float)
    deepest = samples[["top_m", "base_m"]].max(axis=1).to_numpy(dtype=float)
    slack = np.maximum(tolerance, tolerance_relative * td)
    with np.errstate(invalid="ignore"):
        fires = deepest > td + slack
    applies = samples["kind"].ne("outcrop").to_numpy()
    outcome = judge(samples.index, applies=applies, known=~np.isnan(td) & ~np.isnan(deepest), fires=fires)
    facts = pd.DataFrame({"deepest": deepest, "td": td, "slack": slack}, index=samples.index)
    return Answer(outcome, [_finding(line(facts, row), row) for row in fired(outcome)])


def _finding(fact: pd.Series, row: int) -> Finding:
    text = f"{fact['deepest']:.2f} m is below total depth {fact['td']:.2f} m (tolerance {fact['slack']:.2f} m)."
    more = {
        "alternatives": [
            "total depth of another sidetrack",
            "driller's against logger's depth",
            "feet read as metres",
            "typing error",
        ],
        "discriminating_test": "check total depth and depth unit in the well file",
    }
    return Finding(row, "", REJECT, text, (), float(fact["deepest"]), float(fact["td"] + fact["slack"]), more=more)


RULE = Rule(
    id="depth_beyond_td",
    family="depth",
    title="Not below total depth",
    tests="A sample cannot come from below the bottom of the well.",
    check=check,
    inputs=("top", "base", "total depth of the well"),
    flags="the sample",
    formula="deeper end > TD + max(1 m, 0.1 % of TD)",
    message="The sample is below total depth",
    source="our default, no publication",
    must_not_fire="Within the tolerance: driller's and logger's depths differ by metres.",
    example="TD 3120, sample 3125.5 fires.",
)
