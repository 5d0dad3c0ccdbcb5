"""Two clean wells made of numbers: cuttings every 10 m through two units, every index reported."""

import numpy as np

from qc.rules.records import table_of

WELLS = (
    {"name": "Quill 1", "uwi": "Q-1", "td_m": 2405.0, "datum_m": 30.0, "ground_m": 22.0},
    {"name": "Brill 7", "uwi": "B-7", "td_m": 2405.0, "datum_m": 30.0, "ground_m": 22.0},
)
UNITS = (("Lower Marl", 2000.0, 130.0), ("Upper Marl", 2200.0, 420.0))


def records(per_unit: int = 20, wells: int = 2) -> list[dict]:
    """Plain records; TOC 0.6-6 wt%, HI as the unit's within 3 %, Tmax 436-442 °C, Ro on every fourth sample."""
    random = np.random.default_rng(7)
    made = []
    for well in range(wells):
        for unit, (name, start, hydrogen) in enumerate(UNITS):
            for place in range(per_unit):
                made.append(
                    _record(
                        random,
                        well=well,
                        unit=name,
                        top=start + 10 * place,
                        hydrogen=hydrogen,
                        number=unit * per_unit + place + 1,
                    )
                )
    return made


def _record(random, *, well: int, unit: str, top: float, hydrogen: float, number: int) -> dict:
    toc = round(float(np.exp(random.uniform(np.log(0.6), np.log(6.0)))), 2)
    s2 = round(toc * hydrogen / 100 * float(random.normal(1, 0.03)), 2)
    s1 = round(0.09 * s2 * float(random.normal(1, 0.05)), 2)
    s3 = round(0.4 + 0.1 * toc, 2)
    tmax = 436 + (top - 2000) / 100 + float(random.normal(0, 0.8))
    record = {
        "well": well, "label": f"{'QB'[well]}-{number:03d}", "kind": "cuttings", "top_m": top, "base_m": top + 10,
        "top_text": f"{top:g}", "base_text": f"{top + 10:g}", "formation": unit, "unit": unit, "table": well, "file": "a.csv",
        "TOC": f"{toc:.2f}", "S1": f"{s1:.2f}", "S2": f"{s2:.2f}", "S3": f"{s3:.2f}", "TMAX": f"{tmax:.0f}",
        "HI": f"{100 * s2 / toc:.0f}", "OI": f"{100 * s3 / toc:.0f}", "PI": f"{s1 / (s1 + s2):.2f}",
    }  # fmt: skip
    if number % 4 == 0:
        record |= {"RO": f"{0.68 + (top - 2000) / 4000:.2f}", "RO_N": "30"}
    return record


def clean(**more):
    """The typed table of both wells."""
    tops = [(well, name, start, "1") for well in (0, 1) for name, start, _ in UNITS]
    muds = [(well, 0.0, 2405.0, "water", "KCl") for well in (0, 1)]
    return table_of(records(**more), wells=WELLS, tops=tops, muds=muds)
