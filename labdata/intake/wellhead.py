"""What a table says of the wells themselves: position, operator, elevation and kind of the datum, aliases."""

from labdata.intake import values
from labdata.intake.columns import Column
from labdata.intake.matching import WellPlan
from labdata.intake.prepared import Prepared
from labdata.intake.units import FOOT_M
from labdata.models import DatumKind

_DATUMS = {
    "kb": DatumKind.KELLY_BUSHING, "rkb": DatumKind.KELLY_BUSHING, "kelly bushing": DatumKind.KELLY_BUSHING,
    "rt": DatumKind.ROTARY_TABLE, "rotary table": DatumKind.ROTARY_TABLE, "df": DatumKind.DRILL_FLOOR,
    "drill floor": DatumKind.DRILL_FLOOR, "derrick floor": DatumKind.DRILL_FLOOR, "gl": DatumKind.GROUND_LEVEL,
    "gr": DatumKind.GROUND_LEVEL, "ground level": DatumKind.GROUND_LEVEL, "msl": DatumKind.SEA_LEVEL,
}  # fmt: skip


def well_details(made: Prepared) -> None:
    """Give every new well what its first row says of it. A well that is held already keeps what it has."""
    for table in made.tables:
        columns = {column.field: column for column in table.columns if not column.is_result}
        wanted = [
            code
            for code in ("LATITUDE", "LONGITUDE", "OPERATOR", "ELEVATION", "DATUM", "WELL_ALIAS")
            if code in columns
        ]
        if not wanted:
            continue
        for row in table.rows:
            plan = made.wells.get(row.well)
            if plan is None or not row.head:
                continue
            if alias := row.head.get("WELL_ALIAS"):
                plan.aliases.add(alias)
            if plan.pk is None and not plan.details:
                plan.details = _details(row.head, columns)
                _complain(made, plan, row.line)


def _details(head: dict[str, str], columns: dict[str, Column]) -> dict[str, str | float]:
    details: dict[str, str | float] = {}
    for code, limit in (("LATITUDE", 90.0), ("LONGITUDE", 180.0)):
        number = values.read_text(head.get(code, "")).value
        if number is not None and abs(number) <= limit:
            details[code.lower()] = number
    if operator := head.get("OPERATOR"):
        details["operator"] = operator[:120]
    if datum := _DATUMS.get(head.get("DATUM", "").casefold().strip()):
        details["datum_kind"] = str(datum)
    elevation, unit = (
        values.read_text(head.get("ELEVATION", "")).value,
        columns["ELEVATION"].unit if "ELEVATION" in columns else "",
    )
    if elevation is not None and unit in {"m", "ft"}:
        details["datum_elevation_m"] = elevation * (FOOT_M if unit == "ft" else 1.0)
    return details


def _complain(made: Prepared, plan: WellPlan, line: int) -> None:
    if ("latitude" in plan.details) != ("longitude" in plan.details):
        made.findings.warning(
            "position_incomplete",
            f"Row {line}: the position of «{plan.name}» is incomplete or out of range.",
            value=plan.name,
            remedy="Correct it in the registry.",
        )
