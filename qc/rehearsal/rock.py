"""Faults of the rock or of the measurement: peaks change, and the laboratory computes its indices from them."""

import numpy as np
import pandas as pd

from qc.rehearsal.copying import Copy
from qc.rehearsal.kind import MODERATE, SAMPLE, STRONG, UNIT, Injected, Kind, Random, Rows, each, measured
from qc.rules import fits
from qc.rules.facts import sandstone
from qc.rules.table import Table

CARBON = 0.083  # wt% organic carbon per mg HC/g rock (Espitalié et al. 1985, two-peak convention)
OIL_IN_S2 = 0.1  # mg of S2 for each mg of oil in S1: its heavy end
REAL_S2 = 0.5  # mg/g: an S2 peak from which Tmax may be read
UNIT_SAMPLES = 10
UNDOUBTED = 0.7  # share of a unit's samples without doubt at the outset
RESAMPLES = 2000


def oil_targets(table: Table, free: pd.Index) -> list[Rows]:
    """Samples of rock with S1, S2 and TOC; free oil belongs in reservoir sandstone."""
    rows = table.rows.loc[measured(table, free, "S1", "S2", "TOC")]
    return each(rows.index[(rows["S2"] >= REAL_S2) & (rows["TOC"] > 0) & ~sandstone(rows)])


def oil(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected:
    """Base oil in the cuttings: S1 up, a tenth as much in S2, its carbon in TOC."""
    row = rows[0]
    toc, share = copy.value(row, "TOC"), {MODERATE: 2.0, STRONG: 4.0}[strength]
    added = max(share * toc, share) * float(random.uniform(0.9, 1.1))
    said = copy.put(row, "S1", copy.value(row, "S1") + added)
    copy.put(row, "S2", copy.value(row, "S2") + OIL_IN_S2 * added)
    copy.put(row, "TOC", toc + CARBON * (1 + OIL_IN_S2) * added)
    copy.follow(row)
    return Injected(rows, said)


def stain_targets(table: Table, free: pd.Index) -> list[Rows]:
    rows = table.rows.loc[measured(table, free, "S1", "S2", "TOC", "TMAX")]
    return each(rows.index[(rows["S2"] >= REAL_S2) & rows["TMAX"].between(415, 470) & ~sandstone(rows)])


def stain(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected | None:
    """Heavy oil stains the rock: PI rises and the S2 peak comes earlier."""
    row = rows[0]
    rise, fall = {MODERATE: (0.20, 15.0), STRONG: (0.35, 25.0)}[strength]
    s1, s2 = copy.value(row, "S1"), copy.value(row, "S2")
    wanted = s1 / (s1 + s2) + rise
    if wanted >= 0.9:
        return None
    added = wanted * s2 / (1 - wanted) - s1
    said = copy.put(row, "S1", s1 + added)
    copy.put(row, "TOC", copy.value(row, "TOC") + CARBON * added)
    said += "; " + copy.put(row, "TMAX", copy.value(row, "TMAX") - fall * float(random.uniform(0.95, 1.05)))
    copy.follow(row)
    return Injected(rows, said)


def tiny_targets(table: Table, free: pd.Index) -> list[Rows]:
    rows = table.rows.loc[measured(table, free, "S2", "TMAX")]
    return each(rows.index[rows["S2"] >= REAL_S2])


def tiny_s2(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected:
    """Next to no S2, and the instrument gives a Tmax all the same."""
    row = rows[0]
    low, high = {MODERATE: (0.10, 0.18), STRONG: (0.02, 0.08)}[strength]
    s2 = float(random.uniform(low, high))
    if copy.has(row, "S1"):
        copy.put(row, "S1", copy.value(row, "S1") * s2 / copy.value(row, "S2"))
    said = copy.put(row, "S2", s2)
    said += "; " + copy.put(row, "TMAX", copy.value(row, "TMAX") + float(random.uniform(-60, 60)))
    copy.follow(row)
    return Injected(rows, said)


def fibre_targets(table: Table, free: pd.Index) -> list[Rows]:
    rows = table.rows.loc[measured(table, free, "S2", "TMAX", "TOC")]
    return each(rows.index[(rows["TMAX"] > 410) & (rows["TOC"] < 20)])


def fibre(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected:
    """Cellulose fibre or the like in the cuttings: much S2 and S3 that comes early, more TOC."""
    row = rows[0]
    low, high, added = {MODERATE: (380.0, 396.0, 1.5), STRONG: (340.0, 370.0, 3.0)}[strength]
    said = copy.put(row, "TMAX", float(random.uniform(low, high)))
    copy.put(row, "S2", copy.value(row, "S2") + added)
    copy.put(row, "TOC", copy.value(row, "TOC") + 0.25 * added)
    if copy.has(row, "S3"):
        copy.put(row, "S3", copy.value(row, "S3") + 0.8 * added)
    copy.follow(row)
    return Injected(rows, said)


def carbon_targets(table: Table, free: pd.Index) -> list[Rows]:
    rows = table.rows.loc[measured(table, free, "S1", "S2", "TOC")]
    return each(rows.index[rows["TOC"] >= 0.2])


def too_much_carbon(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected:
    """S2 of another sample or another calibration: S1 and S2 hold more carbon than TOC."""
    row = rows[0]
    least, excess = {MODERATE: (0.08, 0.15), STRONG: (0.15, 0.50)}[strength]
    toc = copy.value(row, "TOC")
    carbon = toc + max(least, excess * toc) * float(random.uniform(1.0, 1.1))
    said = copy.put(row, "S2", carbon / CARBON - copy.value(row, "S1"))
    copy.follow(row)
    return Injected(rows, said)


def retention_targets(table: Table, free: pd.Index) -> list[Rows]:
    """Units of one well and sample kind, mostly undoubted, whose S2-TOC line can be drawn and goes through the origin."""
    rows = table.rows.loc[measured(table, table.rows.index, "S2", "TOC")]
    rows = rows[(rows["TOC"] > 0) & (rows["S2"] >= 0)]
    found = []
    for _, group in rows[rows["unit"].ne("")].groupby(["well", "unit", "kind"], sort=True):
        toc, tmax = group["TOC"].to_numpy(dtype=float), group["TMAX"].dropna()
        if len(group) < UNIT_SAMPLES or group.index.isin(free).mean() < UNDOUBTED:
            continue
        wide = toc.max() / toc.min() >= 3.5 and (toc < 2).sum() >= 3
        uniform = len(tmax) >= 4 and float(np.subtract(*np.percentile(tmax, [75, 25]))) <= 8
        if wide and uniform and _offset(group)[0] < 0.08:
            found.append(tuple(int(row) for row in group.index))
    return found


def _offset(unit: pd.DataFrame) -> tuple[float, float]:
    """TOC at which the unit's line meets S2 = 0, and by how much less it may be (95 %) [wt%]."""
    toc, s2 = unit["TOC"].to_numpy(dtype=float), unit["S2"].to_numpy(dtype=float)
    order = np.lexsort((s2, toc))
    line = fits.theil_sen(toc[order], s2[order])
    if not line.slope > 0:
        return np.inf, np.inf
    meets = -line.intercept / line.slope
    return meets, meets - fits.bootstrap(toc[order], s2[order], RESAMPLES).crossing[0]


def retention(copy: Copy, rows: Rows, strength: str, random: Random) -> Injected | None:
    """The matrix of a whole unit holds back the S2 of so much TOC, never more than 85 % of a sample's S2."""
    toc0 = {MODERATE: 0.20, STRONG: 0.30}[strength]
    held = copy.rows.loc[list(rows)]
    if float(held["TOC"].quantile(0.1)) < toc0 or _offset(held)[1] > toc0 / 3:
        return None
    kept = toc0 * float(np.median(held["S2"] / held["TOC"]))
    for row in rows:
        s2 = copy.value(row, "S2")
        copy.put(row, "S2", s2 - min(kept * float(random.uniform(0.9, 1.1)), 0.85 * s2))
        copy.follow(row)
    return Injected(rows, f"S2 of {len(rows)} samples lower by about {kept:.2f} mg/g")


NO_PEAKS = "no undoubted sample of rock has what this fault changes: S1, S2, TOC or Tmax measured above their floors"
KINDS = (
    Kind("oil_based_mud", "Contamination by oil-based drilling fluid", SAMPLE,
         {MODERATE: "2 mg of base oil in S1 for each wt% TOC, at least 2 mg/g (OSI rises by about 200)",
          STRONG: "4 mg of base oil in S1 for each wt% TOC, at least 4 mg/g (OSI rises by about 400)"},
         ("free_oil_crossover", "s1_toc_line", "pi_high_for_maturity", "oil_based_fluid_interval", "additive_signature"),
         oil_targets, oil, NO_PEAKS),
    Kind("oil_stain", "Stain: PI up and Tmax down together", SAMPLE,
         {MODERATE: "PI higher by 0.20, Tmax lower by 15 °C", STRONG: "PI higher by 0.35, Tmax lower by 25 °C"},
         ("pi_low_tmax_pair", "pi_high_for_maturity", "free_oil_crossover", "s1_toc_line", "tmax_shift_suspect"),
         stain_targets, stain, NO_PEAKS),
    Kind("s2_suppression", "S2 held back by the matrix of a unit", UNIT,
         {MODERATE: "the S2 of 0.20 wt% TOC is missing in every sample of a unit of which nine tenths hold more, and whose own line is known to 0.067 wt% TOC",
          STRONG: "the S2 of 0.30 wt% TOC is missing in every sample of a unit of which nine tenths hold more, and whose own line is known to 0.10 wt% TOC"},
         ("s2_toc_fit",), retention_targets, retention,
         "no unit has at least 10 undoubted samples of one kind with a TOC range of 3, three below 2 wt%, even maturity and an "
         "S2-TOC line through the origin"),
    Kind("tmax_of_tiny_s2", "Tmax read from next to no S2", SAMPLE,
         {MODERATE: "S2 0.10-0.18 mg/g, Tmax anywhere within 60 °C", STRONG: "S2 0.02-0.08 mg/g, Tmax anywhere within 60 °C"},
         ("s2_floor_for_tmax", "tmax_range"), tiny_targets, tiny_s2, NO_PEAKS),
    Kind("cellulose_tmax", "Cellulose-like Tmax of a fibre additive", SAMPLE,
         {MODERATE: "Tmax 380-396 °C, S2 higher by 1.5 mg/g", STRONG: "Tmax 340-370 °C, S2 higher by 3 mg/g"},
         ("tmax_range", "additive_signature", "tmax_shift_suspect"), fibre_targets, fibre, NO_PEAKS),
    Kind("carbon_impossible", "More carbon in S1 and S2 than in TOC", SAMPLE,
         {MODERATE: "carbon of S1 and S2 above TOC by 15 %, at least 0.08 wt%",
          STRONG: "carbon of S1 and S2 above TOC by 50 %, at least 0.15 wt%"},
         ("pyro_carbon_balance", "hi_ceiling"), carbon_targets, too_much_carbon, NO_PEAKS),
)  # fmt: skip
