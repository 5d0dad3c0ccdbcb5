"""Maturity against true vertical depth: Theil-Sen lines of each well, and what departs from them."""

from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from qc.rules import fits
from qc.rules.facts import not_rock
from qc.rules.robust import madn, modified_z
from qc.rules.spans import Floats
from qc.rules.survey import at_depth
from qc.rules.table import Table

POINTS_SHOWN = 100


@dataclass(frozen=True)
class Trend:
    """The line of one well. ``rows`` in the order of the table, with depth ``z`` [m TVD below ground] and value ``y``.

    ``reason`` says why there is no line; ``depth`` how true vertical depth was had.
    """

    well: int
    rows: tuple[int, ...]
    z: Floats
    y: Floats
    line: fits.Line
    depth: str
    reason: str = ""

    @property
    def predicted(self) -> Floats:
        return self.line.intercept + self.line.slope * self.z

    @property
    def away(self) -> Floats:
        return self.y - self.predicted

    @property
    def scores(self) -> Floats:
        """Modified z of the residuals; NaN where they have no spread."""
        return modified_z(self.away)

    @property
    def scale(self) -> float:
        return madn(self.away)

    def plot(self) -> dict[str, Any]:
        """The line and its points, as evidence shows them."""
        shown = slice(None, None, max(1, -(-len(self.z) // POINTS_SHOWN)))
        return {
            "slope": round(self.line.slope, 9), "intercept": round(self.line.intercept, 6), "n": len(self.z), "depth": self.depth,
            "z_m": [round(float(one), 2) for one in self.z[shown]], "y": [round(float(one), 5) for one in self.y[shown]],
        }  # fmt: skip


def of_wells(table: Table, rows: pd.DataFrame, values: Floats, *, samples_min: int, span_min: float) -> list[Trend]:
    """A trend for each well with values at known depths, in the order of the wells; outcrop and what is no rock left out."""
    usable = pd.Series(~np.isnan(values), index=rows.index) & rows["top_m"].notna() & rows["kind"].ne("outcrop")
    usable &= ~not_rock(rows)
    own = pd.Series(values, index=rows.index)
    made = []
    for well, members in rows[usable].groupby("well", sort=True):
        z, how = below_ground(table, well, members)
        made.append(_trend(members, z, own[members.index].to_numpy(), how, (samples_min, span_min)))
    return made


def _trend(rows: pd.DataFrame, z: Floats, y: Any, how: str, limits: tuple[int, float]) -> Trend:
    places = tuple(int(row) for row in rows.index)
    reason = ""
    if len(z) < limits[0]:
        reason = f"{len(z)} values, fewer than {limits[0]}"
    elif np.ptp(z) < limits[1]:
        reason = f"they span {np.ptp(z):.0f} m, less than {limits[1]:.0f}"
    line = fits.Line(np.nan, np.nan) if reason else fits.theil_sen(z, y)
    return Trend(int(rows["well"].iloc[0]), places, z, y, line, how, reason)


def below_ground(table: Table, well: Any, rows: pd.DataFrame) -> tuple[Floats, str]:
    """(true vertical depth below ground or sea floor [m], how it was had) of the middle of each sample."""
    ends = np.where(rows["base_m"].isna(), rows["top_m"], rows["base_m"]).astype(float)
    md = (rows["top_m"].to_numpy(dtype=float) + ends) / 2
    own = table.survey[table.survey["well"] == well].sort_values("md_m")
    tvd, how = md, "no survey: hole taken as vertical"
    if len(own) > 1:
        md_m, inclination, azimuth = (
            own[name].to_numpy(dtype=float) for name in ("md_m", "inclination_deg", "azimuth_deg")
        )
        made = at_depth(md_m, inclination, azimuth, md)
        tvd, how = np.where(rows["depth_kind"].eq("TVD"), md, made), "minimum curvature"
    fact = table.wells.loc[well]
    air = fact["datum_m"] + fact["water_m"] if fact["water_m"] > 0 else fact["datum_m"] - fact["ground_m"]
    if np.isnan(air):
        return tvd, how + "; ground level unknown: depth below the datum"
    return tvd - float(air), how
