"""Sweep axes: the points their text stands for."""

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from slabsim.constants import C0
from slabsim.stack.reader import parse_stack
from tests.stack.texts import SLAB


def sweep(spectrum='"10 GHz"', angle='"30 deg"', rest=""):
    text = SLAB.replace('spectrum = "10 GHz"', f"spectrum = {spectrum}")
    return parse_stack(text.replace('angle = "30 deg"', f"angle = {angle}\n{rest}")).sweep


@pytest.mark.parametrize(
    ("spectrum", "expected", "unit"),
    [
        ('{ from = "5 GHz", to = "8 GHz", points = 4 }', [5e9, 6e9, 7e9, 8e9], "GHz"),
        ('{ from = "8 GHz", to = "5 GHz", points = 4 }', [5e9, 6e9, 7e9, 8e9], "GHz"),
        ('{ from = "500 MHz", to = "2 GHz", points = 4 }', [0.5e9, 1e9, 1.5e9, 2e9], "MHz"),
        ('{ from = "1 THz", to = "100 THz", points = 3, spacing = "log" }', [1e12, 1e13, 1e14], "THz"),
        ('{ from = "5 GHz", to = "5 GHz", points = 1 }', [5e9], "GHz"),
        ('{ from = "1 um", to = "2 µm", points = 3 }', C0 / np.array([2e-6, 1.5e-6, 1e-6]), "um"),
        ('{ from = "2000 nm", to = "1 um", points = 3 }', C0 / np.array([2e-6, 1.5e-6, 1e-6]), "nm"),
        ('{ from = "100 1/cm", to = "300 cm^-1", points = 3 }', C0 * np.array([1e4, 2e4, 3e4]), "cm^-1"),
        ('{ values = ["1 cm", "10 GHz", "1 THz"] }', [10e9, C0 / 1e-2, 1e12], "cm"),
        ('"1.55 um"', [C0 / 1.55e-6], "um"),
    ],
)
def test_a_spectrum_is_spaced_as_written_and_ascends_in_frequency(spectrum, expected, unit):
    found = sweep(spectrum)
    assert_allclose(found.frequencies, expected, rtol=1e-15)
    assert found.spectral_unit == unit


def test_round_angles_stay_round():
    assert_array_equal(sweep(angle='{ from = "0 deg", to = "89 deg", points = 90 }').angles_deg, np.arange(90.0))
    assert_array_equal(sweep(angle='{ values = ["60 deg", "0 deg"] }').angles_deg, [0.0, 60.0])
    assert_allclose(sweep(angle='"0.5 rad"').angles_deg, [np.rad2deg(0.5)], rtol=1e-15)


def test_azimuths_may_go_all_around_and_be_negative():
    found = sweep(rest='azimuth = { from = "-180 deg", to = "180 deg", points = 5 }')
    assert_array_equal(found.azimuths_deg, [-180.0, -90.0, 0.0, 90.0, 180.0])
    assert_array_equal(sweep(rest='azimuth = "-45 deg"').azimuths_deg, [-45.0])


@pytest.mark.parametrize(("text", "expected"), [('"TM"', ("TM",)), ('["TM"]', ("TM",)), ('["TM", "TE"]', ("TM", "TE"))])
def test_one_polarization_or_both(text, expected):
    assert sweep(rest=f"polarization = {text}").polarizations == expected
