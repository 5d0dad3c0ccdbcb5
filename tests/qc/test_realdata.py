"""The rules on published data: what they must find, and what they must leave alone.

Expected figures are those computed from the files with plain pandas; the sources stand in tests/data/realdata.
"""

import numpy as np
import pytest

from qc.rules.engine import run
from qc.rules.facts import production_index
from tests.qc import realdata


@pytest.fixture(scope="module")
def australia():
    table = realdata.australia()
    return table, run(table)


@pytest.fixture(scope="module")
def mowry():
    table = realdata.mowry()
    return table, run(table)


@pytest.fixture(scope="module")
def eagle_ford():
    table = realdata.eagle_ford()
    return table, run(table)


def test_indices_rounded_from_unrounded_values_do_not_fire(australia, eagle_ford):
    """HI of the Eagle Ford core was made from unrounded TOC: 19 of 29 rows differ by more than one unit, none is wrong."""
    for table, answers in (australia, eagle_ford):
        assert answers["index_recalc"].counts()["fire"] == 0, table
        assert answers["index_recalc"].counts()["cannot_evaluate"] == 0
    assert australia[1]["index_recalc"].counts()["pass"] == 277 + 151 + 275  # HI, OI and PI pairs of the file


def test_the_one_wrong_sum_of_the_mowry_file_fires(mowry):
    """Sample -103 reports G.P. 6.84 where S1 + S2 = 7.11; its S2/S3 does not fit its S2 either."""
    table, answers = mowry
    findings = answers["index_recalc"].findings
    assert {table.rows.at[finding.row, "label"] for finding in findings} == {"WRB-2018-103"}
    assert {finding.analyte for finding in findings} == {"GP", "S2S3"}
    assert answers["index_recalc"].counts()["pass"] == 6 * 129 - 2


def test_counts_of_the_australian_wells(australia):
    table, answers = australia
    tmax = answers["s2_floor_for_tmax"].outcome[:491]
    assert len(tmax) == 491
    assert (tmax != "not_applicable").sum() == 175  # reported Tmax
    assert (tmax == "cannot_evaluate").sum() == 1  # one Tmax without S2
    pi, tmax_values = production_index(table.rows), table.rows["TMAX"].to_numpy()
    with np.errstate(invalid="ignore"):
        assert ((pi > 0.2) & (tmax_values < 435)).sum() == 18
    assert answers["pi_high_for_maturity"].counts()["fire"] == 5  # the others have too small peaks


def test_means_outside_their_own_extremes_fire(australia):
    """Five rows of Sextonville 1 report a mean reflectance below its minimum."""
    table, answers = australia
    astray = [finding for finding in answers["vr_count_sd"].findings if "RO_MIN" in finding.inputs]
    assert [table.wells.at[table.rows.at[finding.row, "well"], "name"] for finding in astray] == ["Sextonville 1"] * 5
    assert {finding.severity for finding in astray} == {"reject-candidate"}


def test_high_pi_of_immature_mowry_rock(mowry):
    """11 rows have PI above 0.2 and Tmax below 435; one of them has S1 + S2 below 0.5."""
    assert mowry[1]["pi_high_for_maturity"].counts()["fire"] == 10
    assert mowry[1]["s2_floor_for_tmax"].counts()["fire"] == 4
    assert [finding.severity for finding in mowry[1]["s2_floor_for_tmax"].findings].count("reject-candidate") == 1


def test_censored_toc_is_not_silently_passed(eagle_ford):
    """Rows -162 and -183 report TOC <0.2 and no peaks."""
    table, answers = eagle_ford
    balance = answers["pyro_carbon_balance"].outcome
    assert list(table.rows.loc[balance.index[balance == "cannot_evaluate"], "label"]) == ["E170504-162", "E170504-183"]


@pytest.mark.parametrize("rule", ["pyro_carbon_balance", "hi_ceiling", "pyro_value_range", "free_oil_crossover"])
def test_good_data_stay_quiet(mowry, eagle_ford, rule):
    assert not mowry[1][rule].findings
    assert not eagle_ford[1][rule].findings
