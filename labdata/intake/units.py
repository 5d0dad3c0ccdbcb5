"""Units as laboratories write them, and their factors into canonical units (UCUM names where there are any).

Feet are international feet, 0.3048 m exactly. A unit that needs more than a factor (kelvin, fahrenheit) has none.
"""

import re
import unicodedata

FOOT_M = 0.3048

# how a unit may be written, after folding -> our name for it
_SPELLED = {
    "wt%": "wt% wt.% wtpct wtpercent weight% weightpercent weightpct massprozent mass% masse% mass.% gew% gew.% ma% ma.% %wt pctwt"
           " %(m/m) %w/w w/w% vekt% %vekt %peso peso% %masse gewichts% gew.-% %gew",
    "%": "% pct percent prozent procent prosent porcentaje pourcent porciento porcento perc",
    "vol%": "vol% vol.% v% %vol volume% %vv %(v/v) %v/v %bulkvolume %bv %pv %porevolume",
    "fraction": "fraction frac fract dec decimal v/v g/g kg/kg anteil fracción fração fractie m3/m3 unitless dimensionless -",
    "mg/g TOC": "mg/gtoc mghc/gtoc mgco2/gtoc mg/gcorg mghc/gcorg mgco2/gcorg mg/gc mghc/gc mgco2/gc mg/goc mg/gorgc mg/gcot mghc/gcot"
                " mgco2/gcot kg/ttoc mgkw/gtoc mgkw/gcorg mgoil/gtoc mgco/gtoc",
    "mg/g": "mg/g mghc/g mghc/grock mghc/grocha mghc/groca mghc/groche mgco2/g mgco2/grock mgco2/groche mgco2/groca mg/grock mg/groche"
            " mg/groca mg/grocha mg/gsample mghc/gsample mgco2/gsample kg/t kghc/t g/kg mgkw/g mgkw/ggestein mg/ggestein mgco2/ggestein"
            " mgco/g mgco/grock mgh/g mg/gest mghc/grk mgoil/grock mg/gbergart",
    "ug/g": "ug/g ppm ppmw ppmwt mg/kg g/t g/tonne ppmm mcg/g",
    "ng/g": "ng/g ppb ug/kg mg/t",
    "permil": "‰ permil permille promille permilvpdb ‰vpdb ‰pdb ‰vsmow ‰vcdt ‰cdt ‰smow vpdb pdb vcdt o/oo 0/00 permilpdb permilvcdt permilvsmow"
              " ‰(vpdb) ‰v-pdb ‰v-cdt v-pdb v-cdt",
    "degC": "degc °c c celsius degreec degreesc degreecelsius degreescelsius grad grados gradc ºc deg. deg",
    "degF": "degf °f f fahrenheit",
    "K": "k kelvin",
    "kJ": "kj kj/g kj/kg j/g kcal kcal/kg",
    "kg": "kg",
    "mV": "mv millivolt",
    "mD": "md millidarcy millidarcies mda",
    "D": "darcy darcies",
    "uD": "ud microdarcy microdarcies",
    "nD": "nd nanodarcy nanodarcies",
    "g/cm3": "g/cm3 g/cc gm/cc gm/cm3 gr/cc g/ml gcc gmcc t/m3 g/c3 gcm-3 gr/cm3",
    "kg/m3": "kg/m3 k/m3",
    "API": "api gapi apiunits apicounts apiu",
    "cps": "cps counts",
    "m": "m meter meters metre metres metros metro mètre mètres mmd mrkb mkb mbkb mrt m(md) mmdrt mmdkb mbrt mtr mtrs mbsf mdrt metr",
    "ft": "ft feet foot ftmd fuss fuß pies pieds pieds ftkb ftrkb ftbkb ft(md) ft.md fot voet pés pes ' ftmdkb ftdrt",
    "ratio": "ratio - none",
    "count": "n count counts number",
    "%Ro": "%ro %rr %rm %vro ro% %vr %rv %r0 %rmax",
}  # fmt: skip
_NAMED = {
    spelling: name
    for name, spellings in reversed(_SPELLED.items())
    for spelling in (*spellings.split(), re.sub(r"\s+", "", name.casefold()))
}

# canonical unit -> reported unit -> factor
_FACTORS: dict[str, dict[str, float]] = {
    "wt%": {"wt%": 1, "%": 1, "fraction": 100, "mg/g": 0.1, "ug/g": 1e-4, "ng/g": 1e-7, "permil": 0.1},
    "%": {"%": 1, "%Ro": 1, "wt%": 1, "vol%": 1, "fraction": 100},
    "mg/g": {"mg/g": 1, "ug/g": 1e-3, "wt%": 10, "%": 10},
    "mg/g TOC": {"mg/g TOC": 1, "mg/g": 1},
    "ug/g": {"ug/g": 1, "ng/g": 1e-3, "mg/g": 1e3, "wt%": 1e4, "%": 1e4, "fraction": 1e6},
    "fraction": {"fraction": 1, "ratio": 1, "%": 0.01, "wt%": 0.01, "vol%": 0.01},
    "degC": {"degC": 1},
    "mD": {"mD": 1, "D": 1e3, "uD": 1e-3, "nD": 1e-6},
    "g/cm3": {"g/cm3": 1, "kg/m3": 1e-3},
    "permil": {"permil": 1},
    "API": {"API": 1},
    "ratio": {"ratio": 1, "fraction": 1},
    "count": {"count": 1},
    "m": {"m": 1, "ft": FOOT_M},
}


def fold(text: str) -> str:
    """A unit text without blanks, case, accents of micro, superscripts and minus signs between letters."""
    plain = unicodedata.normalize("NFKC", text).casefold().replace("μ", "u").replace("µ", "u").replace("º", "°")
    plain = re.sub(r"[\s,]+", "", plain).replace("₂", "2").replace("^", "").replace("\\", "/")
    plain = plain.strip("[](){}.,;:_")
    plain = re.sub(r"(?<=[a-z])-(?=[a-z])", "", plain)  # mgHC/g-rock
    return re.sub(r"\*?g-1$", "/g", plain)


def parse(text: str) -> str:
    """Our name of a unit as a laboratory writes it, or "" when it is none that we know.

    ``mg HC/g rock``, ``mgHC/g-rock`` and ``kg/t`` are ``mg/g``; ``Wt. %`` is ``wt%``; ``feet`` is ``ft``.
    """
    folded = fold(text)
    for spelling in (folded, folded.replace(".", ""), folded.replace("per", "/"), _bare(folded), _plain(folded)):
        if name := _NAMED.get(spelling):
            return name
    return ""


def _plain(folded: str) -> str:
    """Without letters that a wrong encoding left behind: ``â°c`` and ``?c`` are ``c``."""
    return re.sub(r"[^a-z0-9/%.]", "", folded) if not folded.isascii() or "?" in folded else folded


def _bare(folded: str) -> str:
    """``wt%hc``, ``wt%rock`` and ``%dry`` without the word that only says of what."""
    return re.sub(r"(?<=%)(?:hc|rock|toc|corg|c|s|dry|drywt|bulk|wholerock|caco3|eq)$", "", folded)


def factor(reported: str, canonical: str) -> float | None:
    """What a number in ``reported`` is multiplied by to be in ``canonical``; None when no factor leads there."""
    if reported == canonical and reported:
        return 1.0
    return _FACTORS.get(canonical, {}).get(reported)


def convertible(canonical: str) -> list[str]:
    """Units from which a factor leads to ``canonical``."""
    return list(_FACTORS.get(canonical, {canonical: 1}))
