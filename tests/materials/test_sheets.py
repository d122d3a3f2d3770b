"""Sheet admittances against closed values."""

from math import log, pi, sin, sqrt

import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.constants import C0, ETA0, TWO_PI
from slabsim.errors import InputError
from slabsim.materials.sheets import film_admittance, patch_admittance, strip_admittance

K0 = TWO_PI * np.array([10e9, 20e9]) / C0
AIR = np.ones(2, dtype=complex)


def test_patches_in_air():
    # period 2 mm, gap 0.2 mm, 10 GHz: Z = 761.008869 ohm, capacitive; with exp(-i w t) that is +i
    y0, ee = patch_admittance(2e-3, 0.2e-3, K0, AIR, AIR)
    assert_allclose(ETA0 / y0[0], 761.008869j, rtol=1e-7)
    assert_allclose(abs(2.0 / (2.0 + y0[0])) ** 2, 0.942270562, rtol=1e-8)  # transmission
    assert_allclose(ee, 1.0)


def test_strips_in_air_are_the_babinet_twin_of_patches():
    patches, _ = patch_admittance(2e-3, 0.2e-3, K0, AIR, AIR)
    strips, _ = strip_admittance(2e-3, 0.2e-3, K0, AIR, AIR)
    assert_allclose(ETA0 / strips[0], -46.6242034j, rtol=1e-7)
    assert_allclose((ETA0 / patches) * (ETA0 / strips), ETA0**2 / 4.0, rtol=1e-13)


def test_patches_follow_the_published_grid_parameter():
    # Luukkonen et al., IEEE TAP 56, 1624 (2008), from memory: Z_TM = i eta_e/(2 alpha), exp(-i w t)
    before, after = AIR * 10.2, AIR
    y0, ee = patch_admittance(2e-3, 0.2e-3, K0, before, after)
    assert_allclose(ee, 5.6)
    alpha = K0 * sqrt(5.6) * 2e-3 / pi * log(1.0 / sin(pi * 0.1 / 2.0))
    assert_allclose(ETA0 / y0, 1j * ETA0 / sqrt(5.6) / (2.0 * alpha), rtol=1e-13)


def test_strips_do_not_see_the_permittivity_along_themselves():
    dense, ee = strip_admittance(2e-3, 0.2e-3, K0, AIR * 10.2, AIR)
    alpha = K0 * sqrt(5.6) * 2e-3 / pi * log(1.0 / sin(pi * 0.1 / 2.0))
    assert_allclose(ETA0 / dense, -1j * ETA0 / sqrt(5.6) * alpha / 2.0, rtol=1e-13)
    assert_allclose(ee, 5.6)


@pytest.mark.parametrize("sheet", [patch_admittance, strip_admittance])
def test_lossy_surroundings_make_a_passive_sheet(sheet):
    y0, _ = sheet(2e-3, 0.2e-3, K0, AIR * (4.0 + 0.5j), AIR)
    assert np.all(y0.real >= 0.0)


@pytest.mark.parametrize(("sheet", "what"), [(patch_admittance, "gap"), (strip_admittance, "width")])
@pytest.mark.parametrize("opening", [0.0, 2e-3, 3e-3])
def test_an_opening_must_fit_in_the_period(sheet, what, opening):
    with pytest.raises(
        InputError, match=f"{what} = .* with period = 2 mm; the {what} must lie between 0 and the period"
    ):
        sheet(2e-3, opening, K0, AIR, AIR)


def test_a_film_is_a_conductance():
    y0, ee = film_admittance(ETA0 / 2.0, None, None, AIR, AIR * 3.0)
    assert_allclose(y0, 2.0)
    assert_allclose(ee, 2.0)
    y0, _ = film_admittance(None, 5.8e7, 10e-9, AIR, AIR)
    assert_allclose(y0, 0.58 * ETA0, rtol=1e-14)


def test_half_a_film_is_refused():
    with pytest.raises(InputError, match="a film needs sheet_resistance, or conductivity and thickness"):
        film_admittance(None, 5.8e7, None, AIR, AIR)
