"""Tops given by true vertical depth become measured depths: along the well's survey, or where a person says it is vertical."""

from collections.abc import Callable

import numpy as np

from labdata.intake.findings import Findings
from labdata.intake.importers.records import WellKey, WellTable

VERTICAL = "vertical well"
Survey = list[tuple[float, float, float]]


def place_tops(
    table: WellTable,
    findings: Findings,
    survey_of: Callable[[WellKey], Survey],
    datum_of: Callable[[WellKey], float | None],
) -> None:
    """Set ``top_md_m`` of every top in the table; those that cannot be placed are named as errors or asked about."""
    kept = []
    for row in table.rows:
        if "top_md_m" in row.values:
            kept.append(row)
            continue
        tvd = row.values.pop("tvd_m", None)
        below_sea = row.values.pop("tvdss_m", None)
        datum = datum_of(row.well)
        if tvd is None and datum is not None and below_sea is not None:
            tvd = below_sea + datum
        cell = f"{_letter(table)}{row.line}"
        if tvd is None:
            findings.error(
                "datum_unknown", f"Row {row.line} gives depth below sea level, and the well's datum elevation is not known.",
                sheet=table.sheet, cell=cell, remedy="Register the elevation of the well's datum, or send measured depths.",
            )  # fmt: skip
            continue
        measured = _measured(tvd, survey_of(row.well), row.well, findings, table.sheet)
        if measured is not None:
            row.values["top_md_m"] = measured
            kept.append(row)
    table.rows = kept


def _letter(table: WellTable) -> str:
    return next((column.letter for column in table.columns if column.field in {"TVDSS", "TVD"}), "A")


def _measured(tvd: float, survey: Survey, well: WellKey, findings: Findings, sheet: str) -> float | None:
    """Measured depth [m] of a true vertical depth [m]."""
    if len(survey) > 1:
        found = along(tvd, survey)
        if found is not None:
            return found
        _beyond(tvd, well, findings, sheet)
        return None
    id_ = f"vertical:{well[0] or well[1]}"
    if any(finding.id == id_ for finding in findings.found):
        return None
    answer = findings.ask(
        id_, "tops_by_true_depth", f"The tops of «{well[0] or well[1]}» are given by true vertical depth, and no survey of the well is held.",
        [VERTICAL], sheet=sheet, value=well[0] or well[1],
        remedy=f"Bring the deviation survey in first, or if the well is vertical answer «{id_}» with «{VERTICAL}».",
    )  # fmt: skip
    return tvd if answer == VERTICAL else None


def _beyond(tvd: float, well: WellKey, findings: Findings, sheet: str) -> None:
    findings.error(
        "below_survey", f"A top at {tvd:.2f} m true vertical depth lies beyond the survey of «{well[0] or well[1]}».",
        id=f"below_survey:{well[0] or well[1]}:{tvd:.3f}", sheet=sheet, remedy="Bring a survey in that reaches so deep.",
    )  # fmt: skip


def along(tvd: float, survey: Survey) -> float | None:
    """The shallowest measured depth [m] of a true vertical depth [m], by minimum curvature; None outside the survey."""
    from qc.rules.survey import path  # noqa: PLC0415

    stations = np.asarray(survey, dtype=float)
    if stations[0, 0] > 0:
        stations = np.vstack([[0.0, 0.0, stations[0, 2]], stations])
    depths = path(*stations.T)[0]
    for at in range(len(depths) - 1):
        if depths[at] <= tvd <= depths[at + 1] and depths[at + 1] > depths[at]:
            return _within(tvd, stations[at], stations[at + 1], float(depths[at]))
    return None


def _within(tvd: float, above: np.ndarray, below: np.ndarray, start: float) -> float:
    """Bisection on the arc between two stations, to a tenth of a millimetre."""
    inc1, inc2 = np.radians([above[1], below[1]])
    azi1, azi2 = np.radians([above[2], below[2]])
    cosine = np.cos(inc2 - inc1) - np.sin(inc1) * np.sin(inc2) * (1 - np.cos(azi2 - azi1))
    beta = float(np.arccos(np.clip(cosine, -1.0, 1.0)))
    length = float(below[0] - above[0])

    def depth_at(share: float) -> float:
        if beta < 1e-9:
            return start + share * length * float(np.cos(inc1))
        turn = share * beta
        part1 = np.cos(inc1) * (np.sin(turn) - (1 - np.cos(turn)) / np.tan(beta))
        part2 = np.cos(inc2) * (1 - np.cos(turn)) / np.sin(beta)
        return start + length / beta * float(part1 + part2)

    low, high = 0.0, 1.0
    while (high - low) * length > 1e-5:
        middle = (low + high) / 2
        low, high = (middle, high) if depth_at(middle) < tvd else (low, middle)
    return float(above[0]) + (low + high) / 2 * length
