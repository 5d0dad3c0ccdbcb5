"""Carbonate that decomposes within S3 and raises OI."""

from typing import Any

import numpy as np
import pandas as pd
from scipy import stats

from qc.rules.facts import made_or_reported, positive, says
from qc.rules.rule import INFO, WARN, Answer, Finding, Rule, fired, judge, say
from qc.rules.spans import Floats, exact, line, num, span, word
from qc.rules.table import Table

CALCITE_PER_CARBON = 8.333  # CaCO3 for one part of inorganic carbon, by atomic masses


def carbonate(rows: pd.DataFrame) -> Floats:
    """Carbonate [wt%]: as measured, else as calcite from mineral or inorganic carbon."""
    made = exact(rows, "CARB")
    for carbon in ("MINC", "TIC"):
        made = np.where(np.isnan(made), CALCITE_PER_CARBON * exact(rows, carbon), made)
    return made


def check(
    table: Table, *, toc_min: float, oi_max: float, carbonate_max: float, oi_with_carbonate: float, siderite_max: float,
    coal_toc: float, rank_correlation: float,
) -> Answer:  # fmt: skip
    """One check for each row with S3. Carbonate must be known only where OI is high enough for it to matter."""
    rows = table.of("pyrolysis")
    facts = pd.DataFrame(
        {"toc": exact(rows, "TOC"), "carbonate": carbonate(rows), "siderite": exact(rows, "SIDERITE")}, index=rows.index
    )
    oi = np.where(
        np.isnan(exact(rows, "OI")), 100 * exact(rows, "S3") / positive(facts["toc"].to_numpy()), exact(rows, "OI")
    )
    facts["oi"] = oi
    facts["lean"], lean_known = span(rows, "TOC").below(toc_min)
    facts["high"] = facts["oi"] > oi_max
    facts["with_carbonate"] = (facts["carbonate"] > carbonate_max) & (facts["oi"] > oi_with_carbonate)
    facts["with_siderite"] = facts["siderite"] >= siderite_max
    fires = facts[["lean", "high", "with_carbonate", "with_siderite"]].any(axis=1)
    known = lean_known & facts["oi"].notna() & ((facts["oi"] <= oi_with_carbonate) | facts["carbonate"].notna())
    no_rule = rows["kind"].eq("outcrop") | (facts["toc"] > coal_toc) | says(rows, r"decarbonat|acidif|weathered")
    applies = (rows["S3_id"] >= 0) | (rows["OI_id"] >= 0)
    outcome = judge(rows.index, applies=applies & ~no_rule, known=known, fires=fires)
    facts["rho"] = rows["well"].map(_rank_correlation(rows, facts)).astype(float)
    limits = {"lean": toc_min, "high": oi_max, "with_carbonate": carbonate_max, "with_siderite": siderite_max}
    return Answer(outcome, [_finding(rows, line(facts, row), row, limits, rank_correlation) for row in fired(outcome)])


def _rank_correlation(rows: pd.DataFrame, facts: pd.DataFrame) -> dict[Any, float]:
    """Spearman's rho of S3 with carbonate a well, where at least 8 samples have both."""
    both = pd.DataFrame({"well": rows["well"], "s3": exact(rows, "S3"), "carbonate": facts["carbonate"]}).dropna()
    return {
        well: float(stats.spearmanr(group["s3"], group["carbonate"]).statistic)
        for well, group in both.groupby("well")
        if len(group) >= 8 and group["s3"].nunique() > 1 and group["carbonate"].nunique() > 1
    }


def _finding(rows: pd.DataFrame, fact: pd.Series, row: int, limits: dict[str, float], strong: float) -> Finding:
    reasons = {
        "lean": f"TOC {word(rows, row, 'TOC_q')}{say(num(rows, row, 'TOC'))} wt% is below {say(limits['lean'])}",
        "high": f"OI is above {say(limits['high'])}",
        "with_carbonate": f"{say(fact['carbonate'])} wt% carbonate stands with it",
        "with_siderite": f"{say(fact['siderite'])} wt% siderite stands with it",
    }
    held = [name for name in reasons if fact[name]]
    shown = f"OI {say(fact['oi'])} may not be that of kerogen: " if np.isfinite(fact["oi"]) else "OI cannot be read: "
    text = shown + "; ".join(reasons[name] for name in held)
    well_rho = float(fact["rho"])
    if well_rho > strong:
        text += f"; in this well S3 follows carbonate (rank correlation {well_rho:.2f})"
    more = {
        "carbonate_wt_pct": None if np.isnan(fact["carbonate"]) else round(float(fact["carbonate"]), 2),
        "rank_correlation": None if np.isnan(well_rho) else round(well_rho, 3),
        "alternatives": [
            "weathered or coaly organic matter",
            "siderite or other low-temperature carbonate",
            "lean rock",
        ],
        "discriminating_test": "re-run after careful removal of carbonate; XRD for siderite",
    }
    analyte = made_or_reported(rows, row, "OI", "S3")
    computed = None if np.isnan(fact["oi"]) else round(float(fact["oi"]), 2)
    return Finding(
        row,
        analyte,
        INFO if held == ["lean"] else WARN,  # lean alone: toc_floor_for_indices warns of it already
        text + ".",
        ("OI", "S3", "TOC", "CARB", "MINC", "TIC", "SIDERITE"),
        computed,
        limits[held[0]],
        more=more,
    )


RULE = Rule(
    id="s3_carbonate_interference",
    family="validity",
    title="OI is not made of carbonate",
    tests="CO2 from carbonate can enter S3 and raise OI, most so in lean and in siderite-bearing rock.",
    check=check,
    inputs=("S3", "OI", "TOC", "CARB", "MINC", "TIC", "SIDERITE"),
    flags="OI (S3 where OI is not reported)",
    formula="TOC < 0.5, or OI > 150, or carbonate > 20 wt% and OI > 100, or siderite >= 2 wt%; for information where TOC is the only reason",
    message="OI may hold carbonate CO2",
    source="our default, no publication; basis from memory of Katz 1983, Org. Geochem. 4:195, and Peters 1986",
    must_not_fire="Outcrop, weathered rock and coal with a genuinely high OI; decarbonated splits.",
    example="S3 0.90, TOC 0.42, siderite 4 %: OI 214, fires.",
)
