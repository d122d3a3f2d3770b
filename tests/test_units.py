"""Texts with units: values, refusals, formatting."""

from math import pi

import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim import units
from slabsim.errors import UnitError


@pytest.mark.parametrize(
    ("text", "dimension", "expected"),
    [
        ("2.5 mm", "length", 2.5e-3),
        ("50um", "length", 50e-6),
        ("50 µm", "length", 50e-6),  # micro sign
        ("50 μm", "length", 50e-6),  # Greek mu
        ("+1.e-3 m", "length", 1e-3),
        (".5 in", "length", 12.7e-3),
        ("10 mil", "length", 254e-6),
        ("0.3 THz", "spectral", 0.3e12),
        ("2 rad/s", "spectral", 1 / pi),
        ("30 deg", "angle", pi / 6),
        ("30°", "angle", pi / 6),
        ("2 mrad", "angle", 2e-3),
        ("5.8e7 S/m", "conductivity", 5.8e7),
        ("58 MS/m", "conductivity", 5.8e7),
        ("5.8e5 S/cm", "conductivity", 5.8e7),
        ("50 Ω", "resistance", 50.0),
        ("50 \u2126", "resistance", 50.0),
        ("3 mohm", "resistance", 3e-3),
        ("3 Mohm", "resistance", 3e6),
        ("1 nH", "inductance", 1e-9),
        ("7 fH", "inductance", 7e-15),
        ("0.1 pF", "capacitance", 1e-13),
        ("3 aF", "capacitance", 3e-18),
        ("8.3 ps", "time", 8.3e-12),
    ],
)
def test_a_text_becomes_its_si_value(text, dimension, expected):
    assert_allclose(units.parse(text, dimension), expected, rtol=2e-16)


def test_spectral_kinds_agree_with_codata():
    # 1 eV/h and 1 eV/(h c): CODATA 2018
    assert_allclose(units.parse("1 eV", "spectral"), 241.798924e12, rtol=1e-9)
    assert_allclose(units.from_hz(units.parse("1 eV", "spectral"), "cm^-1"), 8065.543937, rtol=1e-9)
    assert_allclose(units.from_hz(1e12, "cm^-1"), 33.35640952, rtol=1e-10)
    assert_allclose(units.from_hz(units.parse("1 cm^-1", "spectral"), "rad/s"), 1.883651567e11, rtol=1e-9)
    assert_allclose(units.parse("299.792458 um", "spectral"), 1e12, rtol=1e-15)


@pytest.mark.parametrize("spelling", ["1/cm", "cm-1", "cm^-1", "cm⁻¹", "cm**-1"])
def test_wavenumbers_are_read_in_every_usual_spelling(spelling):
    assert units.parse(f"300 {spelling}", "spectral") == units.parse("300 cm^-1", "spectral")


@pytest.mark.parametrize("unit", units.units_of("spectral"))
def test_from_hz_undoes_to_hz_on_arrays_of_any_shape(unit):
    values = np.random.default_rng(3).uniform(0.1, 10.0, (4, 5))
    assert_allclose(units.from_hz(units.to_hz(values, unit), unit), values, rtol=1e-14)


@pytest.mark.parametrize(
    ("value", "dimension", "message"),
    [
        (12, "length", '12 has no unit; a length is written as text with its unit, such as "2.5 mm"'),
        (["1 mm"], "length", "is no text; a length"),
        ("12", "length", '"12" has no unit; a length is wanted, such as "2.5 mm"'),
        ("2.5 GHz", "length", '"2.5 GHz": "GHz" is a unit of frequency; a length is wanted'),
        ("3 mm", "conductivity", '"mm" is a unit of length; a conductivity is wanted, such as "5.8e7 S/m"'),
        ("3 mm", "rate", r'"mm" is a unit of length; a frequency \(not a wavelength\) is wanted'),
        ("2.5 ghz", "spectral", 'unknown unit "ghz".*did you mean "GHz"?'),
        ("2.5 mmm", "length", 'unknown unit "mmm".*did you mean "mm"?'),
        ("2.5 foo", "time", 'unknown unit "foo"; a time is wanted; known are s, ms, us, ns, ps, fs'),
        ("2,5 mm", "length", '"2,5 mm": write the number with a decimal point'),
        ("nan mm", "length", '"nan mm" does not start with a finite number'),
        ("inf GHz", "spectral", '"inf GHz" does not start with a finite number'),
        ("1e999 mm", "length", '"1e999 mm" is too large a number'),
        ("mm", "length", '"mm" does not start with a finite number'),
        ("", "length", '"" does not start with a finite number'),
        ("0 um", "spectral", '"0 um": a wavelength cannot be zero'),
    ],
)
def test_a_wrong_text_is_refused_with_what_is_wanted(value, dimension, message):
    with pytest.raises(UnitError, match=message):
        units.parse(value, dimension)


def test_a_quantity_keeps_the_number_and_the_unit_as_written():
    assert units.read_quantity("1.55 µm", "spectral") == (1.55, "um")
    assert units.read_quantity("80 deg", "angle") == (80.0, "deg")


@pytest.mark.parametrize(
    ("length", "expected"),
    [
        (2.5e-3, "2.5 mm"),
        (50e-6, "50 um"),
        (999.9999999e-6, "1 mm"),
        (0.0, "0 m"),
        (-3e-9, "-3 nm"),
        (4e-14, "0.04 pm"),
    ],
)
def test_lengths_are_written_with_the_fitting_prefix(length, expected):
    assert units.format_length(length) == expected


def test_frequencies_are_written_with_the_fitting_prefix_and_digits():
    assert units.format_frequency(12.3e9) == "12.3 GHz"
    assert units.format_frequency(1.23456789e12, digits=3) == "1.23 THz"
    assert units.format_spectral(units.parse("1.55 um", "spectral"), "um") == "1.55 um"
