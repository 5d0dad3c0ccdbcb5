"""The worked examples of the rule catalogue for isotopes, gases and chromatography, each with what must pass beside it."""

import pytest

from qc.rules.isotopes.chromatography import bray_evans, marzi, odd_even, philippi
from qc.rules.isotopes.deltas import vsmow
from qc.rules.isotopes.gases import bernard, canonical_variable
from tests.qc.asking import ask, only, outcomes

ISO = {"method": "isotopes"}
GC = {"method": "gc"}


@pytest.mark.parametrize(("cells", "severity"), [
    ({"D13C_ORG": "28.4"}, "reject-candidate"), ({"D13C_ORG": "-28.4"}, None), ({"D13C_ORG": "-38.0"}, "warn"),
    ({"D13C_CARB": "8.0"}, "warn"), ({"D13C_CARB": "1.2"}, None), ({"D13C_C1": "-130"}, "reject-candidate"),
    ({"D13C_CO2": "-8"}, None), ({"D34S": "70"}, "reject-candidate"),
])  # fmt: skip
def test_d13c_range(cells, severity):
    assert [finding.severity for finding in ask("d13c_range", {**ISO, **cells}).findings] == (
        [severity] if severity else []
    )


def test_d13c_range_asks_for_the_sign_and_does_not_read_bounds():
    assert "sign" in only("d13c_range", {**ISO, "D13C_ORG": "28.4"}).message
    assert outcomes("d13c_range", {**ISO, "D13C_ORG": ">-28.4"}) == {"cannot_evaluate"}


@pytest.mark.parametrize(("header", "remark", "outcome"), [
    ("d13C (permil)", "", "fire"), ("d13C org VPDB", "", "pass"), ("d13C", "values on VPDB-LSVEC", "pass"),
])  # fmt: skip
def test_isotope_scale_declared(header, remark, outcome):
    record = {**ISO, "D13C_ORG": "-28.4", "remark": remark}
    assert outcomes("isotope_scale_declared", record, headers={(0, "D13C_ORG"): header}) == {outcome}


FRACTIONS = {
    **ISO, "D13C_SAT": "-29.0", "D13C_ARO": "-28.0", "D13C_RESIN": "-27.8", "D13C_ASPH": "-27.5", "F_SAT": "55", "F_ARO": "25",
    "F_RESIN": "15", "F_ASPH": "5",
}  # fmt: skip


@pytest.mark.parametrize(("whole", "changes", "given"), [
    ("-28.5", {}, {"pass"}),  # -28.495
    ("-27.9", {}, {"fire", "pass"}), ("-28.5", {"F_SAT": "30"}, {"cannot_evaluate", "pass"}),
])  # fmt: skip
def test_fraction_mass_balance(whole, changes, given):
    records = [{**FRACTIONS, "D13C_OIL": whole, **changes}]
    assert outcomes("fraction_mass_balance", *records) == given


def test_fractions_out_of_order_are_information():
    assert (
        only("fraction_mass_balance", {**ISO, "D13C_SAT": "-27.0", "D13C_ARO": "-28.0", "D13C_RESIN": "-27.8"}).severity
        == "info"
    )


@pytest.mark.parametrize(("values", "outcome"), [
    (("-45", "-32", "-29"), "pass"), (("-30", "-33", "-29"), "fire"), (("-45", None, None), "not_applicable"),
    (("-45", "<-32", None), "cannot_evaluate"),
])  # fmt: skip
def test_gas_isotope_order(values, outcome):
    record = {**ISO, **dict(zip(("D13C_C1", "D13C_C2", "D13C_C3"), values, strict=True))}
    assert outcomes("gas_isotope_order", record) == {outcome}


def test_published_gas_and_oil_numbers():
    assert bernard(90, 5, 3) == 11.25
    assert canonical_variable(-28.5, -27.0) == pytest.approx(0.515, abs=1e-3)
    assert canonical_variable(-29.0, -28.6) == pytest.approx(-1.772, abs=1e-3)
    assert vsmow(-4.5) == pytest.approx(26.28, abs=5e-3)  # Brand et al. 2014, from memory


@pytest.mark.parametrize(
    ("sat", "aro", "outcome"),
    [
        ("-28.5", "-27.0", "fire"),
        ("-29.0", "-28.6", "pass"),
        ("-29.0", None, "not_applicable"),
        ("-29.0", "<-27", "cannot_evaluate"),
    ],
)
def test_sofer_cv(sat, aro, outcome):
    assert outcomes("sofer_cv", {**ISO, "D13C_SAT": sat, "D13C_ARO": aro}) == {outcome}


@pytest.mark.parametrize(("cells", "outcome"), [
    ({"F_SAT": "50.0", "F_ARO": "23.6", "F_RESIN": "15.0", "F_ASPH": "5.0"}, "pass"),  # 93.6
    ({"F_SAT": "40.0", "F_ARO": "23.6", "F_RESIN": "15.0", "F_ASPH": "5.0"}, "fire"),
    ({"F_SAT": "40.0", "F_ARO": "23.6", "F_RESIN": "15.0", "F_ASPH": "5.0", "remark": "topped oil"}, "not_applicable"),
    ({"GAS_C1": "90.0", "GAS_C2": "5.7", "GAS_C3": "3.0", "GAS_CO2": "1.0"}, "pass"),  # 99.7
    ({"GAS_C1": "90.0", "GAS_C2": "5.7", "GAS_C3": "0.3", "GAS_CO2": "1.0"}, "fire"), ({"F_SAT": "50.0"}, "not_applicable"),
    ({"F_SAT": "50.0", "F_ARO": "23.6", "F_RESIN": "15.0", "F_ASPH": "<5.0"}, "cannot_evaluate"),
])  # fmt: skip
def test_sum_checks(cells, outcome):
    assert outcomes("sum_checks", {**GC, **cells}) == {outcome}


@pytest.mark.parametrize(
    ("ratio", "severity"), [("11.8", "warn"), ("0", "warn"), ("0.5", "info"), ("4.0", "info"), ("1.5", None)]
)
def test_prph_label(ratio, severity):
    assert [finding.severity for finding in ask("prph_label", {**GC, "PR_PH": ratio}).findings] == (
        [severity] if severity else []
    )


@pytest.mark.parametrize(("value", "header", "outcome"), [
    ("26.28", "d18O VPDB", "fire"), ("-4.50", "d18O VPDB", "pass"), ("26.28", "d18O VSMOW", "not_applicable"),
])  # fmt: skip
def test_oxygen_scale_slip(value, header, outcome):
    batch = [{**ISO, "label": f"S-{n}", "D18O_CARB": value} for n in range(4)]
    assert outcomes("oxygen_scale_slip", *batch, headers={(0, "D18O_CARB"): header}) == {outcome}


ALKANES = dict(zip(range(21, 35), (3.9, 3.6, 4.0, 3.1, 4.6, 2.8, 5.2, 2.4, 5.0, 1.9, 3.6, 1.2, 1.8, 0.8), strict=True))


def test_carbon_preference_of_the_catalogue():
    """Bray & Evans 1961, Marzi et al. 1993, Scalan & Smith 1970, Philippi: formulas from memory, values by arithmetic."""
    made = [bray_evans(ALKANES), marzi(ALKANES), odd_even(ALKANES, 25), odd_even(ALKANES, 21), philippi(ALKANES)]
    assert made == pytest.approx([1.996, 1.723, 1.962, 1.213, 2.326], abs=1.1e-3)


@pytest.mark.parametrize(("cpi", "remark", "outcome"), [
    ("2.00", "CPI by Bray and Evans", "pass"), ("1.72", "CPI by Bray and Evans", "fire"), ("1.72", "CPI by Marzi", "pass"),
    ("2.00", "", "cannot_evaluate"),
])  # fmt: skip
def test_cpi_oep_recalc(cpi, remark, outcome):
    record = {**GC, "CPI": cpi, "remark": remark, **{f"NC{n}": str(area) for n, area in ALKANES.items()}}
    given = list(ask("cpi_oep_recalc", record).outcome)[:1]
    assert given == [outcome]


def test_cpi_and_maturity():
    mature = {"sample": 1, "label": "M", "TMAX": "450"}
    assert only("cpi_oep_recalc", mature, {**GC, "sample": 1, "CPI": "1.8"}).analyte == "CPI"
    assert not ask("cpi_oep_recalc", {**mature, "TMAX": "430"}, {**GC, "sample": 1, "CPI": "1.8"}).findings
    assert only("cpi_oep_recalc", {**GC, "CPI": "0.7"}).severity == "warn"
