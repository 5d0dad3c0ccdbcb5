"""Headers as laboratories write them: field, unit, and what must not be taken for something else."""

import pytest

from labdata.intake import units
from labdata.intake.headers import recognise


@pytest.mark.parametrize(("header", "field", "unit"), [
    ("TOC (wt%)", "TOC", "wt%"),
    ("TOC, wt.%", "TOC", "wt%"),
    ("TOC wt pct", "TOC", "wt%"),
    ("ABC TOC", "TOC", ""),
    ("TOC_abc (%)", "TOC", "%"),
    ("% CaCO3", "CARB", "%"),
    ("Gesamter organischer Kohlenstoff (Gew.%)", "TOC", "wt%"),
    ("COT (%)", "TOC", "%"),
    ("S1 (mg HC/g rock)", "S1", "mg/g"),
    ("S3 [mg CO2/g rock]", "S3", "mg/g"),
    ("T max", "TMAX", ""),
    ("TMAX(deg C)", "TMAX", "degC"),
    ("HI (mg HC/g TOC)", "HI", "mg/g TOC"),
    ("(S1/TOC)*100", "OSI", ""),
    ("PI (S1/(S1+S2))", "PI", ""),
    ("G.P.", "GP", ""),
    ("S2/S3", "S2S3", ""),
    ("VR(%)", "RO", "%"),
    ("%Ro", "RO", "%"),
    ("VR_NUM", "RO_N", ""),
    ("Al %", "AL", "%"),
    ("Mo ppm", "MO", "ug/g"),
    ("MO_PPM", "MO", "ug/g"),
    ("In ppm", "IN", "ug/g"),
    ("SiO2 (wt.%)", "SIO2", "wt%"),
    ("Qurtz", "QUARTZ", ""),
    ("K-feldspar", "K_FELDSPAR", ""),
    ("δ13Corg (‰ VPDB)", "D13C_ORG", "permil"),
    ("Pr/Ph", "PR_PH", ""),
    ("Grain density (g/cc)", "RHOG", "g/cm3"),
    ("Depth_ft", "TOP", "ft"),
    ("Top Depth (m MD)", "TOP", "m"),
    ("Teufe bis (m)", "BASE", "m"),
    ("Profondeur (m)", "TOP", "m"),
    ("Pozo", "WELL", ""),
    ("Prøvenr.", "SAMPLE", ""),
    ("Monsternummer", "SAMPLE", ""),
    ("Amostra", "SAMPLE", ""),
    ("LIMS ID", "LAB_NO", ""),
    ("API", "UWI", ""),
    ("Depth in feet", "TOP", "ft"),
    ("Depth (m, MD)", "TOP", "m"),
    ("Ro,%", "RO", "%"),
    ("TOC%", "TOC", "%"),
    ("TOC-combustion (wt%)", "TOC", "wt%"),
    ("Pyr. TOC (%)", "TOC", "%"),
    ("Tmax (Â°C)", "TMAX", "degC"),
    ("PI = S1/(S1+S2)", "PI", ""),
    ("Fe2O3(T) (%)", "FE2O3", "%"),
])  # fmt: skip
def test_a_header_is_understood(header, field, unit):
    guess = recognise(header)
    assert guess is not None
    assert (guess.field, guess.unit) == (field, unit)
    assert 0 < guess.confidence <= 1
    assert guess.reason


@pytest.mark.parametrize(
    "header",
    [
        "TOC sd",
        "TOC method",
        "TOC date",
        "Calc. %Ro",
        "TOP AGE(Ma)",
        "map #",
        "Tnsp",
        "SEQ NO",
        "S2 error",
        "TVD (m)",
        "ENO",
        "1234",
        "No data here at all",
    ],
)
def test_a_header_of_something_else_is_left_alone(header):
    assert recognise(header) is None


def test_a_bare_symbol_is_an_element_only_among_elements():
    assert recognise("S", many_elements=True).field == "S"
    assert recognise("S", many_elements=False) is None
    assert recognise("K", many_elements=True).field == "K"
    assert recognise("K", many_elements=False).field == "KAIR"


@pytest.mark.parametrize(("reported", "canonical", "factor"), [
    ("feet", "m", 0.3048),
    ("fraction", "wt%", 100),
    ("ppm", "wt%", 1e-4),
    ("%", "ug/g", 1e4),
    ("ppb", "ug/g", 1e-3),
    ("mg/kg", "ug/g", 1),
    ("kg/t", "mg/g", 1),
    ("%", "fraction", 0.01),
    ("kg/m3", "g/cm3", 1e-3),
    ("°F", "degC", None),
])  # fmt: skip
def test_factors_into_canonical_units(reported, canonical, factor):
    assert units.factor(units.parse(reported), canonical) == factor


@pytest.mark.parametrize("text", ["mg HC/g rock", "mgHC/g-rock", "mg/g", "kg/t", "mg CO2/g rock", "mg HC / g Rock"])
def test_spellings_of_milligrams_per_gram(text):
    assert units.parse(text) == "mg/g"
