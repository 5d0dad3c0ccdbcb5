"""Analyses to the typed table that rules read: the one door from the ORM to pandas.

Everything comes through ``values_list`` in chunks into arrays, never as model objects. Rows are put into an order
made of names, depths and labels alone, so that the same data give the same table on any database.
"""

from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np
import pandas as pd
from django.db.models import QuerySet

from labdata.models import (
    Analysis,
    Analyte,
    CasingShoe,
    CoreRun,
    FormationTop,
    LogCurve,
    MudInterval,
    Result,
    SourceColumn,
    SurveyStation,
    Well,
)
from qc.controls import controls
from qc.models import Decision, Verdict
from qc.rules.decimals import batch_of, half_units
from qc.rules.panels import METHODS
from qc.rules.spans import num
from qc.rules.strat_top_mismatch import current, formations, plain
from qc.rules.table import (
    ANALYTES,
    CORES,
    CURVES,
    IDENTITY,
    MUDS,
    SHOES,
    SURVEY,
    TOPS,
    VALUE_DEFAULTS,
    WELL_COLUMNS,
    WELL_TEXTS,
    Table,
    frame,
    no_things,
)

CHUNK = 20_000
ANALYSIS_FIELDS = {
    "analysis": "id", "sample": "sample_id", "well_id": "sample__well_id", "label": "sample__label",
    "kind": "sample__kind", "formation": "sample__formation", "top_m": "sample__top_md_m",
    "base_m": "sample__base_md_m", "top_text": "sample__top_reported", "base_text": "sample__base_reported",
    "depth_unit": "sample__depth_unit_reported", "depth_kind": "sample__depth_kind", "match_key": "sample__match_key",
    "method": "method__code", "replicate": "replicate", "role": "role", "lab_number": "lab_number",
    "remark": "remark", "laboratory": "laboratory__name", "report_number": "report__number",
    "report_version": "report__version", "file": "report__source_file__name", "table_id": "table_id",
    "sheet": "table__sheet", "cell_range": "table__cell_range", "orientation": "table__orientation", "line": "line",
}  # fmt: skip
RESULT_FIELDS = {
    "analysis": "analysis_id", "analyte": "analyte_id", "value": "value", "q": "qualifier", "text": "value_reported",
    "d": "decimals", "id": "id", "column": "column_id",
}  # fmt: skip
ROW_ORDER = [
    "well", "top_m", "base_m", "label", "kind", "match_key", "method", "replicate", "report_number", "report_version",
    "sheet", "cell_range", "line",
]  # fmt: skip


def read(wells: Sequence[Well]) -> Table:
    """The table of these wells, in the order given: every current analysis of rock, with what the wells know."""
    place = {well.pk: number for number, well in enumerate(wells)}
    rows = _analyses(place)
    tops = _along(FormationTop.objects.filter(well__in=place), ("well_id", "name", "top_md_m", "version"), TOPS, place)
    columns: dict[str, object] = {str(name): rows[name].to_numpy() for name in rows.columns if name in IDENTITY}
    columns["unit"] = _units(rows, tops)
    codes = dict(Analyte.objects.filter(code__in=ANALYTES).values_list("id", "code"))
    held = _results(place, rows, results_of(place).filter(analyte__in=list(codes)), codes)
    for analyte in ANALYTES:
        columns |= _spread(held[held["code"] == analyte], analyte, len(rows))
    made = frame(columns, len(rows))
    _join(made)
    return Table(
        rows=made,
        panels=_panels(place, rows),
        controls=controls(wells, rows),
        headers=_headers(rows),
        wells=_wells(wells),
        tops=tops,
        cores=_along(
            CoreRun.objects.filter(well__in=place),
            ("well_id", "number", "top_md_m", "base_md_m", "shift_to_log_m", "recovered_m"), CORES, place,
        ),
        muds=_along(
            MudInterval.objects.filter(well__in=place), ("well_id", "top_md_m", "base_md_m", "kind", "additives"), MUDS, place
        ),
        shoes=_along(CasingShoe.objects.filter(well__in=place), ("well_id", "md_m"), SHOES, place),
        survey=_along(
            SurveyStation.objects.filter(well__in=place), ("well_id", "md_m", "inclination_deg", "azimuth_deg"), SURVEY, place
        ),
        curves=_curves(place),
    )  # fmt: skip


def rock(wells: Iterable[int]) -> QuerySet[Analysis]:
    """Current analyses of rock of these wells."""
    return Analysis.objects.current().of_rock().filter(sample__well__in=list(wells))


def results_of(wells: Iterable[int]) -> QuerySet[Result]:
    """Current results of the current analyses of rock of these wells."""
    return Result.objects.current().filter(
        analysis__current=True, analysis__role__in=["sample", "duplicate"], analysis__sample__well__in=list(wells)
    )


def _fetch(queryset: QuerySet[Any], fields: dict[str, str]) -> pd.DataFrame:
    """Columns of a query, read in chunks."""
    listed = queryset.order_by().values_list(*fields.values()).iterator(chunk_size=CHUNK)
    return pd.DataFrame.from_records(list(listed), columns=list(fields))


def _analyses(place: dict[int, int]) -> pd.DataFrame:
    """One row an analysis, in the order of the table, with source tables numbered in the same order."""
    rows = _fetch(rock(place), ANALYSIS_FIELDS)
    rows["well"] = rows["well_id"].map(place)
    rows[["top_m", "base_m"]] = rows[["top_m", "base_m"]].astype(float)
    rows["laboratory"] = rows["laboratory"].fillna("")
    rows["across"] = rows["orientation"] == "columns"
    rows["report"] = rows["report_number"] + " v" + rows["report_version"].astype(str)
    rows = rows.sort_values(ROW_ORDER, kind="stable").reset_index(drop=True)
    names = rows[["report_number", "report_version", "sheet", "cell_range", "table_id"]].drop_duplicates()
    ordered = names.sort_values(list(names.columns), kind="stable")["table_id"]
    rows["table"] = rows["table_id"].map({table: number for number, table in enumerate(ordered)})
    stated = SourceColumn.objects.filter(field="REPLICATE", table__in=list(ordered)).values_list("table_id", flat=True)
    rows["replicate_stated"] = rows["table_id"].isin(set(stated))
    return rows


def _units(rows: pd.DataFrame, tops: pd.DataFrame) -> np.ndarray:
    """The formation that groups a sample: as reported (spellings of one name joined), else from the tops."""
    stated = rows["formation"].astype(str).str.strip()
    keys = stated.map(plain)
    spelled = stated.groupby([rows["well"], keys]).transform("min")
    made = spelled.where(stated.ne(""), "").to_numpy(dtype=object)
    blank = stated.eq("") & rows["top_m"].notna() & rows["depth_kind"].ne("TVD")
    for well in sorted(set(tops["well"])):
        own = current(tops, well)
        for row in rows.index[blank & (rows["well"] == well)]:
            made[row] = next(iter(formations(own, num(rows, row, "top_m"), num(rows, row, "top_m"))), "")
    return made


def _panels(place: dict[int, int], rows: pd.DataFrame) -> dict[str, pd.DataFrame]:
    """Method -> its values, for the methods that have panels and were measured."""
    present = [method for method in METHODS if (rows["method"] == method).any()]
    if not present:
        return {}
    codes = dict(Analyte.objects.values_list("id", "code"))
    held = _results(place, rows, results_of(place).filter(analysis__method__code__in=present), codes)
    made = {}
    for method in present:
        index = rows.index[rows["method"] == method]
        own = held[held["row"].isin(index)]
        columns: dict[str, object] = {}
        for analyte in sorted(set(own["code"])):
            columns |= _spread(own[own["code"] == analyte], analyte, len(rows))
        made[method] = pd.DataFrame(columns, index=rows.index).loc[index]
    return made


def _headers(rows: pd.DataFrame) -> dict[tuple[int, int], str]:
    """Header and unit of the columns of tables with isotopes or chromatography, by table and column."""
    asked = rows[rows["method"].isin(["isotopes", "gc"])]
    if asked.empty:
        return {}
    places = dict(zip(asked["table_id"], asked["table"], strict=True))
    held = SourceColumn.objects.filter(table__in=sorted(places)).values_list(
        "table_id", "line", "header", "unit_reported"
    )
    return {(int(places[table]), line): f"{header} {unit}".strip() for table, line, header, unit in held}


def _results(
    place: dict[int, int], rows: pd.DataFrame, results: QuerySet[Result], codes: dict[int, str]
) -> pd.DataFrame:
    """One row a result that rules read: place of its analysis, code, value and where it stood, half-unit, rejected or not."""
    held = _fetch(results, RESULT_FIELDS)
    held["code"] = held["analyte"].map(codes)
    held["row"] = held["analysis"].map(pd.Series(rows.index, index=rows["analysis"]))
    held["value"] = held["value"].astype(float)
    columns = _fetch(
        SourceColumn.objects.filter(table__in=sorted(set(rows["table_id"]))),
        {"column": "id", "col": "line", "factor": "factor", "given": "decimals"},
    ).set_index("column")
    held = held.join(columns, on="column")
    labels = rows["lab_number"].where(rows["lab_number"].ne(""), rows["label"]).map(batch_of)
    batches = pd.Series(labels.to_numpy()[held["row"].to_numpy(dtype=int)], index=held.index, dtype=object)
    held["h"] = half_units(held["column"], batches, held["d"], held["given"]) * held["factor"].abs()
    held["rej"] = held["id"].isin(rejected(place))
    return held


def rejected(wells: Iterable[int]) -> set[int]:
    """Results whose standing decision, the one of the highest id, is a rejection."""
    decided = Decision.objects.filter(result__analysis__sample__well__in=list(wells)).order_by("id")
    standing = dict(decided.values_list("result_id", "verdict").iterator(chunk_size=CHUNK))
    return {result for result, verdict in standing.items() if verdict == Verdict.REJECTED}


def _spread(held: pd.DataFrame, analyte: str, size: int) -> dict[str, object]:
    """The columns of one analyte, from its results."""
    at = held["row"].to_numpy(dtype=int)
    source = {"": "value", "_row": "row"}
    made: dict[str, object] = {}
    for suffix, (default, kind) in VALUE_DEFAULTS.items():
        column = np.full(size, default, dtype=kind)
        column[at] = held[source.get(suffix, suffix[1:])].to_numpy()
        made[f"{analyte}{suffix}"] = column
    return made


def _join(rows: pd.DataFrame) -> None:
    """Give pyrolysis rows what other methods measured on the same sample, where pyrolysis did not measure it itself."""
    pyrolysis = rows["method"] == "pyrolysis"
    for analyte in ANALYTES:
        of = "TOC" if analyte == "TOC_CARBON" else analyte
        method = rows["method"] == "carbon" if of == "TOC" else ~pyrolysis
        donors = rows[method & (rows[f"{of}_id"] >= 0)].drop_duplicates("sample")
        given = pd.Series(donors.index, index=donors["sample"])
        takers = rows.index[pyrolysis & (rows[f"{analyte}_id"] < 0) & rows["sample"].isin(given.index)]
        if not len(takers):
            continue
        source = given[rows.loc[takers, "sample"]].to_numpy()
        for suffix in VALUE_DEFAULTS:
            rows.loc[takers, f"{analyte}{suffix}"] = rows.loc[source, f"{of}{suffix}"].to_numpy()


def _wells(wells: Sequence[Well]) -> pd.DataFrame:
    facts = {
        "name": [well.name for well in wells], "uwi": [well.uwi for well in wells],
        "datum_kind": [well.datum_kind for well in wells],
        "td_m": [well.td_md_m for well in wells], "datum_m": [well.datum_elevation_m for well in wells],
        "ground_m": [well.ground_elevation_m for well in wells], "water_m": [well.water_depth_m for well in wells],
    }  # fmt: skip
    return pd.DataFrame(facts).astype(dict.fromkeys(WELL_COLUMNS[len(WELL_TEXTS) :], float))


def _curves(place: dict[int, int]) -> pd.DataFrame:
    """Gamma curves of the wells, by name."""
    held = LogCurve.objects.filter(well__in=place).order_by("well_id", "mnemonic", "report__number", "id")
    rows = [
        (place[curve.well_id], curve.mnemonic, curve.quantity, *curve.arrays())
        for curve in held.iterator(chunk_size=50)
    ]
    return pd.DataFrame(rows, columns=list(CURVES)) if rows else no_things(*CURVES)


def _along(
    queryset: QuerySet[Any], fields: Sequence[str], columns: Sequence[str], place: dict[int, int]
) -> pd.DataFrame:
    """What is recorded along the wells, by depth."""
    made = _fetch(queryset, dict(zip(columns, fields, strict=True)))
    if made.empty:
        return no_things(*columns)
    made["well"] = made["well"].map(place)
    return made.sort_values(list(columns), kind="stable").reset_index(drop=True)
