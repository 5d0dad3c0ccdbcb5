"""The files are the same bytes every time, and every fault stands in one of them."""

import hashlib
import io
import os
import subprocess
import sys

import pandas as pd
import pytest

from labdata.demo import faults, reporting, workbooks
from labdata.demo.basin import FOOT
from labdata.demo.faults import FAULTS
from labdata.env import CHECKOUT


@pytest.fixture(scope="module")
def tables() -> dict[str, pd.DataFrame]:
    """The pyrolysis tables as they stand in the files, by well, indexed by sample."""
    first = pd.read_excel(io.BytesIO(workbooks.tarrow_1()), header=9, skiprows=[10]).dropna(subset=["S2"])
    second = pd.read_csv(io.BytesIO(workbooks.tarrow_2()), skiprows=2)
    second.columns = [name.split(" (")[0].replace(" Depth", "") for name in second.columns]
    both = pd.read_excel(io.BytesIO(workbooks.two_wells()), header=6, skiprows=[7]).dropna(subset=["S2"])
    both = both.rename(columns={"Depth Top": "Top", "Depth Base": "Base"})
    wells = {"Tarrow 1": first, "Tarrow 2": second} | dict(iter(both.groupby("Well Name")))
    return {name: table.set_index("Sample ID") for name, table in wells.items()}


def test_the_same_bytes_in_another_process():
    program = (
        "import hashlib, django; django.setup(); from labdata.demo.workbooks import files;"
        "print(*(hashlib.sha256(f.content).hexdigest() for f in files()))"
    )
    there = subprocess.run(
        [sys.executable, "-c", program],
        cwd=CHECKOUT, env={**os.environ, "PYTHONHASHSEED": "7", "DJANGO_SETTINGS_MODULE": "labdata.settings"},
        capture_output=True, text=True, check=True,
    ).stdout.split()  # fmt: skip
    assert there == [hashlib.sha256(file.content).hexdigest() for file in workbooks.files()]


def test_as_many_samples_as_a_study_has(tables):
    sizes = {name: len(table) for name, table in tables.items()}
    assert sizes["Tarrow 1"] == 150
    assert 350 <= sum(sizes.values()) <= 500


def test_labels_are_unique_within_a_well(tables):
    assert all(table.index.is_unique for table in tables.values())


@pytest.mark.parametrize("fault", FAULTS, ids=lambda fault: fault.code)
def test_every_fault_names_samples_of_its_well(fault, tables):
    table = tables[fault.well.name]
    assert set(fault.labels) <= set(table.index)
    assert fault.labels or (table["Formation"] == fault.formation).sum() >= 10


def test_oil_based_mud_shows_in_s1_and_pi(tables):
    oily = tables["Tarrow 1"].loc[list(faults.OILY)]
    clean = tables["Tarrow 1"].query("Formation == 'Ostrin Formation' and Top < 2520")
    assert (oily["Top"] >= 2520).all()
    assert (100 * oily["S1"] / oily["TOC"] > 100).mean() > 0.8
    assert oily["PI"].min() > 2 * pd.to_numeric(clean["PI"]).max()


def test_fibre_has_a_low_tmax(tables):
    assert tables["Sallowby 1"].loc[list(faults.FIBRE), "Tmax"].max() < 380


def test_tmax_is_reported_from_next_to_no_s2(tables):
    rows = tables["Sallowby 1"].loc[list(faults.NOISE)]
    assert pd.to_numeric(rows["S2"]).max() < 0.2
    assert rows["Tmax"].notna().all()


def test_reported_hydrogen_index_does_not_follow_from_its_peaks(tables):
    row = tables["Tarrow 1"].loc[faults.HI_ROW]
    assert abs(row["HI"] - 100 * float(row["S2"]) / row["TOC"]) > 50


def test_reported_production_index_is_ten_times_what_its_peaks_give(tables):
    row = tables["Sallowby 1"].loc[faults.PI_ROW]
    assert row["PI"] == pytest.approx(10 * float(row["S1"]) / (float(row["S1"]) + float(row["S2"])), abs=0.06)
    assert row["PI"] <= 1


def test_digits_of_a_depth_changed_places(tables):
    depths = tables["Fennick 1"]["Top"]
    wrong = depths.loc[faults.DEPTH_ROW]
    assert (depths.drop(faults.DEPTH_ROW).diff().dropna() > 0).all()
    assert wrong > depths.drop(faults.DEPTH_ROW).max() or wrong > depths.loc["F1-050"]
    assert sorted(f"{wrong:.2f}") == sorted(
        f"{reporting.faulty_rock(faults.FENNICK_1).loc[faults.DEPTH_ROW, 'top']:.2f}"
    )


def test_a_depth_lies_below_total_depth(tables):
    assert tables["Sallowby 1"].loc[faults.DEEP_ROW, "Top"] > faults.SALLOWBY_1.td


def test_two_samples_share_a_depth(tables):
    first, second = (tables["Tarrow 2"].loc[label] for label in faults.TWICE)
    assert (first["Top"], first["Base"]) == (second["Top"], second["Base"])
    assert first["TOC"] != second["TOC"]


def test_more_pyrolysed_carbon_than_carbon(tables):
    row = tables["Tarrow 2"].loc[faults.TOC_ROW]
    assert 0.083 * (float(row["S1"]) + float(row["S2"])) > 1.2 * float(row["TOC"])


def test_a_peak_below_zero(tables):
    assert float(tables["Tarrow 2"].loc[faults.NEGATIVE_ROW, "S1"]) < 0


def test_top_below_base(tables):
    row = tables["Sallowby 1"].loc[faults.TURNED_ROW]
    assert row["Top"] > row["Base"]


def test_feet_in_the_table_are_the_sampled_metres(tables):
    truth = reporting.faulty_rock(faults.TARROW_2)["top"]
    reported = tables["Tarrow 2"]["Top"] * FOOT
    assert (reported - truth).drop(faults.TWICE[1]).abs().max() < 0.05 * FOOT + 1e-9


def test_the_amended_report_mends_the_slip_and_changes_only_what_it_names():
    first = pd.read_excel(io.BytesIO(workbooks.tarrow_1(1)), header=9, skiprows=[10]).dropna(subset=["S2"]).astype(str)
    second = pd.read_excel(io.BytesIO(workbooks.tarrow_1(2)), header=9, skiprows=[10]).dropna(subset=["S2"]).astype(str)
    changed = first["Sample ID"][(first != second).any(axis=1)]
    assert set(changed) == set(reporting.RUN_AGAIN)
    row = second.set_index("Sample ID").loc[faults.HI_ROW]
    assert float(row["HI"]) == pytest.approx(100 * float(row["S2"]) / float(row["TOC"]), abs=1.0)
