"""Sheets in the reference solver, against circuit formulas and tabulated values."""

import math

import mpmath as mp
import pytest
from numpy.testing import assert_allclose

from tests.reference import sheets
from tests.reference.dense import HalfSpace, Sheet, Slab, solve

AIR = HalfSpace()
PEC = "perfect conductor"
ETA0 = 376.730313668  # CODATA 2018 [ohm]


def k0_of(frequency):
    return 2 * math.pi * frequency / 299_792_458.0


def test_patches_and_strips_are_complementary():
    k0 = k0_of(10e9)
    patch, strip = (f(k0, 0, 2e-3, 0.2e-3, 1, 1) for f in (sheets.patches, sheets.strips))
    assert_allclose(complex(ETA0 / patch.y_tm), 761.008869j, rtol=1e-8)  # derived here
    assert_allclose(complex(ETA0 / strip.y_te), -46.6242034j, rtol=1e-8)
    assert_allclose(complex(patch.y_tm * strip.y_te), 4, rtol=1e-14)  # Babinet
    assert_allclose(solve(AIR, [patch], AIR, k0, 0, "TM").T, 0.942270562, rtol=0, atol=1e-9)
    assert_allclose(solve(AIR, [strip], AIR, k0, 0, "TE").R, 0.942270562, rtol=0, atol=1e-9)


def test_sheets_at_oblique_incidence():
    # Z_TE / Z_TM = 1 / (1 - sin^2 / (2 ee)) of patches, the inverse ratio of strips; ee = 4, sin^2 = 3/4
    patch = sheets.patches(100.0, mp.sqrt(0.75), 2e-3, 0.2e-3, 3, 5)
    strip = sheets.strips(100.0, mp.sqrt(0.75), 2e-3, 0.2e-3, 3, 5)
    assert_allclose(float(abs(patch.y_te / patch.y_tm)), 1 - 0.75 / 8, rtol=1e-14)
    assert_allclose(float(abs(strip.y_te / strip.y_tm)), 1 - 0.75 / 8, rtol=1e-14)
    assert_allclose(complex(patch.y_tm * strip.y_te), 16, rtol=1e-14)  # 4 ee


@pytest.mark.parametrize(
    ("resistance", "theta_deg", "polarization", "powers"),
    [  # T = (2 Rs / (2 Rs + eta))^2, eta the wave impedance of the polarization
        (ETA0 / 2, 0, "TE", (0.25, 0.25, 0.5)),
        (377.0, 0, "TM", (0.111005134, 0.444656475, 0.444338391)),
        (ETA0 / 2, 60, "TE", (4 / 9, 1 / 9, 4 / 9)),
        (ETA0 / 2, 60, "TM", (1 / 9, 4 / 9, 4 / 9)),
    ],
)
def test_resistive_film(resistance, theta_deg, polarization, powers):
    film = sheets.resistive_film(resistance)
    response = solve(AIR, [film], AIR, 100.0, math.radians(theta_deg), polarization)
    assert_allclose([response.R, response.T, response.A], powers, rtol=0, atol=1e-9)
    assert_allclose(response.absorbed[0], response.A, rtol=1e-14)


def test_metal_film_of_equal_sheet_resistance():
    metal, resistive = sheets.metal_film(1e5, 2e-8), sheets.resistive_film(500)
    assert_allclose(float(metal.y_te), float(resistive.y_te), rtol=1e-14)


@pytest.mark.parametrize(("detuning", "R"), [(0.5, 0.2), (0.75, 0.041129061), (1, 0)])
def test_film_in_front_of_a_conductor_absorbs(detuning, R):
    film = Sheet(1, 1)  # quarter-wave absorber: R = cot^2 / (4 + cot^2), derived here
    for polarization in ("TE", "TM"):
        response = solve(AIR, [film, Slab(1, 1, math.pi / 2)], PEC, detuning, 0, polarization)
        assert_allclose(response.R, R, rtol=0, atol=1e-9)
        assert_allclose(response.absorbed, [1 - R, 0], rtol=0, atol=1e-9)
