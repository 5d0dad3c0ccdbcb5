"""LAS 2.0 through lasio: gamma curves, and what the header says of the well."""

import io
import logging
import re
from typing import Any

import lasio
import numpy as np

from labdata.intake import units
from labdata.intake.errors import UnreadableFile
from labdata.intake.findings import Findings
from labdata.intake.importers.records import Curve, WellKey
from labdata.intake.plaintext import plain_lines
from labdata.intake.rows import DEEPEST_M
from labdata.models import CurveQuantity, DatumKind

MAX_BYTES = 60_000_000
NULLS = frozenset({-999.0, -999.25, -9999.0, -9999.25, -99999.0, -999.99})
_GAMMA = re.compile(r"^(?:H?S?E?C?GR|C?SGR|CGR|GRS?|GAM[MN]?A?|GAMMA.*|GRGC|NGT|GR_.+|GR[A-Z0-9]{1,4})$", re.I)
_SPECTRAL = {
    CurveQuantity.POTASSIUM: re.compile(r"^(?:POTA|K|HFK|KPCT|POTASSIUM)$", re.I),
    CurveQuantity.URANIUM: re.compile(r"^(?:URAN|U|HURA|UPPM|URANIUM)$", re.I),
    CurveQuantity.THORIUM: re.compile(r"^(?:THOR|TH|HTHO|THPPM|THORIUM)$", re.I),
}
_ANGLE = re.compile(r"(-?\d{1,3})\D+?(\d{1,2})\D+?(\d{1,2}(?:\.\d+)?)[^0-9A-Za-z]*([NSEW]?)", re.I)
_DATUMS = {
    "kb": DatumKind.KELLY_BUSHING, "kelly bushing": DatumKind.KELLY_BUSHING, "rkb": DatumKind.KELLY_BUSHING,
    "rt": DatumKind.ROTARY_TABLE, "rotary table": DatumKind.ROTARY_TABLE, "df": DatumKind.DRILL_FLOOR,
    "drill floor": DatumKind.DRILL_FLOOR, "gl": DatumKind.GROUND_LEVEL, "ground level": DatumKind.GROUND_LEVEL,
}  # fmt: skip


class LogFile:
    """A LAS file as read. Raises UnreadableFile when it cannot be."""

    def __init__(self, name: str, content: bytes) -> None:
        if len(content) > MAX_BYTES:
            raise UnreadableFile(
                f"«{name}» has {len(content) / 1e6:.0f} MB; {MAX_BYTES / 1e6:.0f} MB is the most that is read of a log.",
                remedy="Send the gamma curves alone.", file=name,
            )  # fmt: skip
        self.name = name
        self.las = _parse(name, plain_lines(name, content))
        if len(self.las.curves) < 2 or len(self.las.curves[0].data) == 0:
            raise UnreadableFile(f"«{name}» is a log without values.", remedy="Send the file again.", file=name)

    def header(self, *mnemonics: str) -> tuple[str, str]:
        """(text, unit) of the first of these header items that says something."""
        for mnemonic in mnemonics:
            for section in (self.las.well, self.las.params):
                for item in section:
                    if item.original_mnemonic.upper() == mnemonic and (text := _said(item)):
                        return text, str(item.unit or "").strip()
        return "", ""

    def well(self) -> WellKey:
        """(name, identifier) as the header states them, "" where it has a null value."""
        name = self.header("WELL", "WELN", "WN")[0]
        uwi = self.header("UWI", "API", "WELLID")[0]
        return name[:120], uwi[:40]

    def facts(self) -> dict[str, Any]:
        """Fields of Well that the header states, elevations in metres."""
        found: dict[str, Any] = {}
        for field, size, names in (
            ("operator", 120, ("COMP",)), ("field", 120, ("FLD",)), ("country", 80, ("CTRY", "COUN")), ("crs", 60, ("GDAT", "HZCS")),
        ):  # fmt: skip
            if text := self.header(*names)[0]:
                found[field] = text[:size]
        for field, limit, names in (("latitude", 90.0, ("LATI", "LAT")), ("longitude", 180.0, ("LONG", "LON"))):
            number = angle(self.header(*names)[0])
            if number is not None and abs(number) <= limit:
                found[field] = number
        return found | self._datum()

    def _datum(self) -> dict[str, Any]:
        """Elevation and kind of the datum that depths were logged from."""
        ground = self._metres("EGL", "GL")
        found: dict[str, Any] = {} if ground is None else {"ground_elevation_m": ground}
        kind = _DATUMS.get(self.header("LMF", "DREF")[0].casefold())
        if kind is None:
            return found
        elevation = self._metres({"KB": "EKB", "DF": "EDF", "GL": "EGL", "RT": "ERT"}[str(kind)])
        base, above = self._metres("EPD"), self._metres("APD")
        if elevation is None and base is not None and above is not None:
            elevation = base + above
        return found if elevation is None else found | {"datum_kind": str(kind), "datum_elevation_m": elevation}

    def _metres(self, *mnemonics: str) -> float | None:
        text, unit = self.header(*mnemonics)
        length = _length_unit(unit)
        try:
            return float(text) * (units.FOOT_M if length == "ft" else 1.0) if length else None
        except ValueError:
            return None

    def curves(self, well: WellKey, findings: Findings) -> list[Curve]:
        """The gamma curves; findings where there is none or the depth unit is not stated."""
        index = self.las.curves[0]
        unit = _length_unit(str(index.unit or ""))
        if not unit:
            unit = findings.ask(
                f"unit:{index.original_mnemonic}", "depth_unit_missing",
                f"The depth curve «{index.original_mnemonic}» of «{self.name}» has no unit of length.", ["m", "ft"],
                value=str(index.unit or ""),
            ) or ""  # fmt: skip
        depths = np.asarray(index.data)
        depths = (
            depths.astype(float) * (units.FOOT_M if unit == "ft" else 1.0) if depths.dtype.kind in "fiu" else depths
        )
        if depths.dtype.kind != "f" or not np.isfinite(depths).all() or depths.min() < -100 or depths.max() > DEEPEST_M:
            findings.error(
                "depth_unreadable",
                f"The depth curve of «{self.name}» has gaps, text or depths that cannot be.",
                remedy="Send the file again.",
            )
            return []
        made = [curve for item in self.las.curves[1:] if (curve := self._curve(item, depths, unit, well, findings))]
        self._say_rest(made, findings)
        return made

    def _curve(self, item: Any, depths: np.ndarray, depth_unit: str, well: WellKey, findings: Findings) -> Curve | None:
        quantity = quantity_of(item.original_mnemonic)
        if quantity is None:
            return None
        values = np.asarray(item.data)
        if values.dtype.kind not in "fiu":
            findings.error(
                "unreadable_value", f"Curve {item.mnemonic} of «{self.name}» holds text.", id=f"curve:{item.mnemonic}",
                value=item.mnemonic, remedy="Correct the curve.",
            )  # fmt: skip
            return None
        values = values.astype(float)
        values[np.isin(values, list(NULLS)) | ~np.isfinite(values)] = np.nan
        self._say_odd(item, depths, values, quantity, findings)
        order = np.argsort(depths, kind="stable")
        return Curve(
            well, item.mnemonic[:40], str(item.descr or "")[:160], quantity, str(item.unit or "")[:24], depth_unit,
            depths[order], values[order],
        )  # fmt: skip

    def _say_odd(self, item: Any, depths: np.ndarray, values: np.ndarray, quantity: str, findings: Findings) -> None:
        empty = int(np.isnan(values).sum())
        if empty:
            message = f"{empty} of {len(values)} readings of {item.mnemonic} are the null value and are kept as gaps."
            findings.note("null_code", message, id=f"null:{item.mnemonic}", value=item.mnemonic)
        negative = values < 0
        if negative.any() and quantity == CurveQuantity.GAMMA:
            where = depths[negative]
            findings.warning(
                "negative_gamma",
                f"{int(negative.sum())} readings of {item.mnemonic} are negative (lowest {np.nanmin(values):g}), from {where.min():g} to {where.max():g} m.",
                id=f"negative:{item.mnemonic}", value=item.mnemonic, remedy="They are kept as reported; do not use them.",
            )  # fmt: skip

    def _say_rest(self, made: list[Curve], findings: Findings) -> None:
        taken = {curve.mnemonic for curve in made}
        rest = [item.mnemonic for item in self.las.curves[1:] if item.mnemonic not in taken]
        if not any(curve.quantity == CurveQuantity.GAMMA for curve in made):
            findings.error(
                "no_gamma", f"«{self.name}» has no gamma curve; its curves are {', '.join(rest)[:200]}.",
                value=", ".join(rest)[:200], remedy="Of logs only gamma is taken in (GR, GAMN, SGR …).",
            )  # fmt: skip
        elif rest:
            findings.note(
                "curves_left", f"Of logs only gamma is taken in; {', '.join(rest)[:300]} stay in the kept file.",
                remedy="Nothing to do.",
            )  # fmt: skip


def quantity_of(mnemonic: str) -> str | None:
    """Which gamma quantity a curve's name means, None for any other curve."""
    plain = mnemonic.strip().split(":")[0]
    for quantity, pattern in _SPECTRAL.items():
        if pattern.match(plain):
            return str(quantity)
    return str(CurveQuantity.GAMMA) if _GAMMA.match(plain) else None


def angle(text: str) -> float | None:
    """Degrees from ``43 35' 47.74" N`` whatever its marks have become, or from a decimal number; west and south negative."""
    try:
        return float(text)
    except ValueError:
        pass
    match = _ANGLE.search(text)
    if match is None:
        return None
    degrees, minutes, seconds = float(match[1]), float(match[2]), float(match[3])
    size = abs(degrees) + minutes / 60 + seconds / 3600
    return -size if match[4].upper() in {"S", "W"} or degrees < 0 else size


def _said(item: Any) -> str:
    """The item's text, "" where it holds a null value or nothing."""
    text = str(item.value if item.value is not None else "").strip()
    try:
        return "" if float(text) in NULLS else text
    except ValueError:
        return text


def _length_unit(text: str) -> str:
    plain = text.strip().strip(".").casefold()
    unit = "ft" if plain in {"f", "ft", "feet", "foot"} else units.parse(plain)
    return unit if unit in {"m", "ft"} else ""


def _parse(name: str, text: str) -> Any:
    """The file by lasio; whatever it cannot read is one refusal."""
    logging.getLogger("lasio").setLevel(logging.ERROR)
    try:
        las = lasio.read(io.StringIO(text), ignore_header_errors=True, mnemonic_case="preserve", null_policy="strict")
    except Exception as trouble:  # lasio raises whatever its parsing meets
        raise UnreadableFile(
            f"«{name}» is a damaged or incomplete well log ({type(trouble).__name__}: {str(trouble)[:120]}).",
            remedy="Send the file again as LAS 2.0.", file=name,
        ) from trouble  # fmt: skip
    version = str(las.version.VERS.value) if "VERS" in las.version else ""
    if not version.startswith(("1", "2")):
        raise UnreadableFile(
            f"«{name}» is LAS version {version or 'unknown'}; version 2.0 is read.",
            remedy="Send it as LAS 2.0.",
            file=name,
        )
    return las
