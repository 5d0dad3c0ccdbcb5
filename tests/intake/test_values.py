"""Cell texts as numbers and depths: what laboratories write, and that nothing written ever breaks the reader."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from labdata.intake.values import (
    AMBIGUOUS,
    BLANK,
    DECIMAL,
    THOUSANDS,
    UNKNOWN,
    UNREADABLE,
    VALUE,
    comma_role,
    number_text,
    read_depth,
    read_number,
    read_text,
)


@pytest.mark.parametrize(("text", "value", "qualifier", "decimals"), [
    ("0.87", 0.87, "", 2),
    (".23", 0.23, "", 2),
    ("5.", 5.0, "", 0),
    ("+1.5", 1.5, "", 1),
    ("<0.05", 0.05, "<", 2),
    ("< 0.05", 0.05, "<", 2),
    ("≤0.2", 0.2, "<", 1),
    (">600", 600.0, ">", 0),
    ("~435", 435.0, "~", 0),
    ("ca. 435", 435.0, "~", 0),
    ("approx 0.5", 0.5, "~", 1),
    ("1,620", 1620.0, "", 0),
    ("1,620.5", 1620.5, "", 1),
    ("12,345,678", 12345678.0, "", 0),
    ("0,45", 0.45, "", 2),
    ("12,5", 12.5, "", 1),
    ("1 234,5", 1234.5, "", 1),
    ("1\u00a0234", 1234.0, "", 0),
    ("1'234.5", 1234.5, "", 1),
    ("\u22120.25", -0.25, "", 2),
    ("–28.1", -28.1, "", 1),
    ("1.2E-03", 0.0012, "", 4),
    ("2e3", 2000.0, "", 0),
    ("2.31 ± 0.05", 2.31, "", 2),
    ("2.31 +/- 0.05", 2.31, "", 2),
    ("431*", 431.0, "", 0),
    ("\u200b0.5\ufeff", 0.5, "", 1),
])  # fmt: skip
def test_a_number_with_its_qualifier_and_decimals(text, value, qualifier, decimals):
    read = read_text(text)
    assert (read.state, read.value, read.qualifier, read.decimals) == (VALUE, value, qualifier, decimals)


@pytest.mark.parametrize(
    "text", ["", " ", "-", "—", "–", "n.a.", "N/A", "na", "not analysed", "nicht bestimmt", "NaN", "-999.25", "-9999"]
)
def test_blanks_are_blank(text):
    assert read_text(text).state == BLANK


@pytest.mark.parametrize(
    "text", ["BDL", "bdl", "<LOD", "< DL", "n.d.", "ND", "not detected", "trace", "tr.", "n.n.", "<"]
)
def test_below_an_unknown_limit_has_a_qualifier_and_no_number(text):
    read = read_text(text)
    assert (read.state, read.value, read.qualifier) == (VALUE, None, "<")


@pytest.mark.parametrize(
    "text",
    [
        "abc",
        "1-2",
        "1.2.3",
        "12 34 5",
        "#N/A",
        "#DIV/0!",
        "Err:502",
        "0.4 - 0.6",
        "inf",
        "1e999",
        "<<5",
        "(0.12)",
        "2024-01-02",
        "4,5,6",
    ],
)
def test_what_is_no_number_says_so(text):
    read = read_text(text)
    assert read.state == UNREADABLE
    assert read.note


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [("450 ppm", "ppm", 450.0), ("0.74%", "%", 0.74), ("431 °C", "°C", 431.0), ("<0.05 wt%", "wt%", 0.05)],
)
def test_a_unit_inside_the_cell_is_handed_on(text, unit, value):
    read = read_text(text)
    assert (read.value, read.unit) == (value, unit)


@pytest.mark.parametrize(("text", "role", "value"), [
    ("1,620", THOUSANDS, 1620.0),
    ("1,620", DECIMAL, 1.62),
    ("1.620", THOUSANDS, 1.62),
    ("1.620", DECIMAL, 1620.0),
    ("0.620", DECIMAL, 0.62),  # no number of thousands begins with 0
])  # fmt: skip
def test_three_digits_after_a_mark_are_read_by_the_role_of_the_comma(text, role, value):
    assert read_text(text, role).value == value


def test_a_comma_of_unknown_role_is_not_guessed():
    assert read_text("1,620", UNKNOWN).state == AMBIGUOUS
    assert read_text("1,62", UNKNOWN).value == 1.62


@pytest.mark.parametrize(("texts", "role"), [
    (["1,620", "0.45"], THOUSANDS),
    (["1,620", "0,45"], DECIMAL),
    (["1.234,5"], DECIMAL),
    (["1,234.5"], THOUSANDS),
    (["1,620", "1,700"], UNKNOWN),
    (["0,45", "0.45"], UNKNOWN),
])  # fmt: skip
def test_the_table_tells_what_its_commas_are(texts, role):
    assert comma_role(texts) == role


@pytest.mark.parametrize(("text", "top", "base", "unit"), [
    ("10120", 10120.0, None, ""),
    ("10,120'", 10120.0, None, "ft"),
    ("10120-10130", 10120.0, 10130.0, ""),
    ("10,120' - 10,130'", 10120.0, 10130.0, "ft"),
    ("1234.5 – 1240.0 m", 1234.5, 1240.0, "m"),
    ("3000 to 3010 ft", 3000.0, 3010.0, "ft"),
    ("1234.56 mMD", 1234.56, None, "m"),
    ("1500 m", 1500.0, None, "m"),
    ("-5", -5.0, None, ""),
])  # fmt: skip
def test_depths_and_intervals(text, top, base, unit):
    read = read_depth(text)
    assert (read.state, read.top, read.base, read.unit) == (VALUE, top, base, unit)


@pytest.mark.parametrize("text", ["ten", "TD", "10 m - 20 ft", "1-2-3", "12/05/2020", "#REF!"])
def test_what_is_no_depth_says_so(text):
    assert read_depth(text).state == UNREADABLE


@given(st.text(max_size=30))
def test_no_text_breaks_the_readers(text):
    for role in (THOUSANDS, DECIMAL, UNKNOWN):
        read, depth = read_text(text, role), read_depth(text, role)
        assert read.state in {VALUE, BLANK, UNREADABLE, AMBIGUOUS}
        assert read.value is None or math.isfinite(read.value)
        assert read.state != VALUE or read.value is not None or read.qualifier == "<"
        assert depth.top is None or math.isfinite(depth.top)


NUMBERS = st.decimals(min_value=-99999, max_value=999999, places=3, allow_nan=False, allow_infinity=False)


@given(NUMBERS, st.integers(0, 3), st.sampled_from(["", "<", ">", "~", "< "]))
def test_a_written_number_is_read_back(number, places, qualifier):
    text = f"{number:.{places}f}"
    read = read_text(qualifier + text)
    if float(text) in {-999.0, -9999.0, -99999.0} and not qualifier:
        return
    assert (read.value, read.decimals, read.qualifier) == (float(text), places, qualifier.strip())


@given(st.decimals(min_value=0, max_value=9_999_999, places=2, allow_nan=False, allow_infinity=False))
def test_thousands_marks_and_decimal_commas_are_read_back(number):
    english = f"{number:,.2f}"
    german = english.translate(str.maketrans(",.", ".,"))
    assert read_text(english, THOUSANDS).value == float(number)
    assert read_text(german, DECIMAL).value == float(number)


@given(
    st.decimals(min_value=0, max_value=9999, places=2),
    st.decimals(min_value=0, max_value=9999, places=2),
    st.sampled_from(["-", " - ", "–", " to "]),
)
def test_an_interval_is_read_back(top, base, dash):
    read = read_depth(f"{top:.2f}{dash}{base:.2f}")
    assert (read.top, read.base) == (float(top), float(base))


@given(st.floats(allow_nan=True, allow_infinity=True))
def test_a_stored_number_is_kept_exactly_or_refused(number):
    read = read_number(number)
    if read.state == VALUE:
        assert read.value == number
        assert float(number_text(number)) == pytest.approx(number, rel=1e-14)
    else:
        assert read.state == BLANK or not math.isfinite(number) or abs(number) > 1e300
