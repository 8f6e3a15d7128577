"""Quantities as people write them. Exact: the inch is 25.4 mm and SI prefixes are powers of ten by definition."""

from __future__ import annotations

import doctest

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck import units


@pytest.mark.parametrize(
    ("text", "mm"),
    [
        ("0.19mm", 0.19), ("42um", 0.042), ("42 um", 0.042), ("42µm", 0.042), ("42μm", 0.042), ("17.5 um", 0.0175),
        ("5mil", 0.127), ("5 mils", 0.127), ("5 thou", 0.127), ("1in", 25.4), ("0.1 inch", 2.54), ('0.5"', 12.7), ("1cm", 10.0),
        ("100nm", 0.0001), ("-0.3mm", -0.3), ("1e-1mm", 0.1), (".5mm", 0.5), ("0", 0.0), ("0.0", 0.0),
    ],
)  # fmt: skip
def test_lengths(text, mm):
    assert units.length(text) == mm  # exact: the float nearest to the decimal number


@pytest.mark.parametrize(
    ("read", "text", "value"),
    [
        (units.time, "300ps", 300e-12), (units.time, "1.5 ns", 1.5e-9), (units.time, "2us", 2e-6), (units.time, "3ms", 3e-3),
        (units.time, "1s", 1.0),
        (units.frequency, "2.5GHz", 2.5e9), (units.frequency, "10 MHz", 1e7), (units.frequency, "1kHz", 1e3),
        (units.frequency, "50Hz", 50.0),
        (units.impedance, "50 ohm", 50.0), (units.impedance, "50ohm", 50.0), (units.impedance, "50Ω", 50.0),
        (units.impedance, "1 kohm", 1000.0),
        (units.ratio, "10%", 0.1), (units.ratio, "7.5 %", 0.075), (units.number, "4.05", 4.05),
    ],
)  # fmt: skip
def test_other_quantities(read, text, value):
    assert read(text) == value


@pytest.mark.parametrize(
    ("read", "text", "sentence"),
    [
        (units.length, "42", "length '42' has no unit; write 42mm"),
        (units.length, "3m", "length '3m' has the unit 'm'; write mm, um, mil or in"),  # metre, milli or mil: not guessed
        (units.length, "5ps", "length '5ps' has the unit 'ps'; write mm, um, mil or in"),
        (units.length, "1,2mm", "length '1,2mm' is not a number with a unit (mm, um, mil or in)"),
        (units.length, "wide", "length 'wide' is not a number with a unit (mm, um, mil or in)"),
        (units.length, "nan mm", "length 'nan mm' is not a number with a unit (mm, um, mil or in)"),
        (units.length, "1e999mm", "length '1e999mm' is not a number with a unit (mm, um, mil or in)"),
        (units.length, "0x10mm", "length '0x10mm' is not a number with a unit (mm, um, mil or in)"),
        (units.time, "300", "time '300' has no unit; write 300ps"),
        (units.impedance, "50", "impedance '50' has no unit; write 50 ohm"),
        (units.ratio, "0.1", "share '0.1' has no unit; write 10%"),
        (units.ratio, "10", "share '10' has no unit; write 10%"),
        (units.number, "4.2mm", "number '4.2mm' takes no unit; write 4.2"),
        (units.number, "", "number '' is not a number"),
    ],
)
def test_what_is_refused(read, text, sentence):
    with pytest.raises(ValueError) as refused:
        read(text)
    assert str(refused.value) == sentence


def test_the_quantity_is_called_by_its_name():
    with pytest.raises(ValueError, match=r"^thickness '42' has no unit; write 42um$"):
        units.length("42", "thickness", "um")


@settings(max_examples=200, deadline=None)
@given(st.text(max_size=30))
def test_any_text_gives_a_number_or_a_sentence(text):
    for read in (units.length, units.time, units.frequency, units.impedance, units.ratio, units.number):
        try:
            assert isinstance(read(text), float)
        except ValueError as refused:
            assert "'" in str(refused)


@settings(max_examples=100, deadline=None)
@given(
    st.decimals(min_value="0.001", max_value="999", places=3), st.sampled_from([("mm", 1.0), ("um", 1e-3), ("mil", 0.0254), ("in", 25.4)])
)
def test_a_length_is_the_number_times_its_unit(value, unit):
    assert units.length(f"{value}{unit[0]}") == pytest.approx(float(value) * unit[1], rel=1e-15)


def test_examples():
    assert doctest.testmod(units).failed == 0
