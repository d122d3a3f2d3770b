"""Dispersion models against published and closed values."""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.constants import C0, EPS0, MU0, TWO_PI
from slabsim.materials.dispersion import (
    Constant,
    Debye,
    Drude,
    Lorentz,
    Oscillator,
    ResonantPermeability,
    Sellmeier,
)

WAVENUMBER = 100.0 * C0  # one cm^-1 as a frequency [Hz]


@pytest.mark.parametrize(
    ("plasma", "collision", "n", "k", "reflectance"),
    [
        # Drude parameters [cm^-1] of Ordal et al., Appl. Opt. 22, 1099 (1983) and 24, 4493 (1985), from
        # memory; n, k and R at 1000 cm^-1 computed from them with the closed formula
        (119000, 660, 31.2642, 104.1183, 0.98947),
        (72800, 215, 7.6086, 71.5721, 0.99414),
        (59600, 73.2, 2.1744, 59.4723, 0.99755),
        (41500, 558, 9.7661, 37.5194, 0.97436),
        (51700, 487, 11.0155, 47.7580, 0.98183),
        (20300, 382, 3.5645, 19.2696, 0.96364),
        (39400, 352, 6.4470, 37.7066, 0.98254),
    ],
)
def test_drude_metals_have_the_index_of_their_parameters(plasma, collision, n, k, reflectance):
    metal = Drude(plasma * WAVENUMBER, collision * WAVENUMBER)
    index = np.sqrt(metal(np.array([1000.0 * WAVENUMBER])))[0]
    assert_allclose((index.real, index.imag), (n, k), atol=1e-4)
    assert_allclose(abs((index - 1) / (index + 1)) ** 2, reflectance, atol=1e-5)


def test_drude_at_the_collision_frequency():
    # at w = g: Im eps = wp^2/(2 g^2) and 1 - Re eps = Im eps; Ordal et al. 1983 state the relation
    eps = Drude(72800.0, 215.0)(np.array([215.0]))[0]
    assert_allclose(eps.imag, 57326.5549, rtol=1e-9)
    assert_allclose(1.0 - eps.real, eps.imag, rtol=1e-12)


def test_fused_silica_has_the_published_index():
    # Malitson, J. Opt. Soc. Am. 55, 1205 (1965): coefficients, and 1.45846 at 0.5876 um
    silica = Sellmeier((0.6961663, 0.4079426, 0.8974794), (0.0684043e-6, 0.1162414e-6, 9.896161e-6))
    wavelengths = np.array([0.5875618, 0.4861327, 0.6328, 1.064, 1.55]) * 1e-6
    index = np.sqrt(silica(C0 / wavelengths).real)
    assert_allclose(index, [1.4584637, 1.4631265, 1.4570179, 1.4496310, 1.4440236], atol=1e-7)


def test_resonant_permeability_turns_negative_above_its_resonance():
    # F = 0.56, f0 = 4 GHz: mu = 0 at f0/sqrt(1 - F), mu = -1 at sqrt(2/(2 - F)) f0; closed formulas
    mu = ResonantPermeability(4.0e9, 0.56, 0.0)
    at = np.array([6.030226892e9, 4.714045208e9, 5e9])
    assert_allclose(mu(at), [0.0, -1.0, -0.555555556], atol=1e-8)


def test_a_damped_resonance_loses():
    mu = ResonantPermeability(4.0e9, 0.56, 0.2e9)(np.array([5e9]))
    assert_allclose(mu, [-0.536585366 + 0.170731707j], atol=1e-9)  # closed formula


def test_half_way_of_a_relaxation():
    # at w tau = 1 the real part is half way and the loss is at its maximum, (static - infinity)/2
    eps = Debye(78.0, 5.2, 8.3e-12)(np.array([1.0 / (TWO_PI * 8.3e-12)]))
    assert_allclose(eps, [(78 + 5.2) / 2 + 0.5j * (78 - 5.2)], rtol=1e-12)


def test_an_oscillator_adds_its_strength_at_zero_frequency_and_loss_at_resonance():
    model = Lorentz(2.1, (Oscillator(1e12, 0.4, 20e9), Oscillator(3e12, 0.2, 10e9)))
    assert_allclose(model(np.array([1.0])), [2.7], rtol=1e-12)
    assert_allclose(Oscillator(1e12, 0.4, 20e9)(np.array([1e12])), [0.4j * 1e12 / 20e9], rtol=1e-12)


def test_conductivity_gives_the_skin_depth():
    # copper, 5.8e7 S/m; delta = sqrt(2/(w mu0 sigma)), about 8.5 mm at 60 Hz in handbooks
    f = np.array([60.0, 1e9, 10e9])
    depth = 1.0 / (TWO_PI * f / C0 * np.sqrt(Constant(1.0, 0.0, 5.8e7)(f)).imag)
    assert_allclose(depth, [8.5316e-3, 2.089807e-6, 0.660855e-6], rtol=2e-6)
    assert_allclose(1.0 / (5.8e7 * depth[1:]), [8.250226e-3, 26.089507e-3], rtol=1e-6)
    assert_allclose(depth, np.sqrt(2.0 / (TWO_PI * f * MU0 * 5.8e7)), rtol=1e-6)


def test_reflection_loss_of_copper_at_300_ghz():
    # exact 1 - R, closed formula; Hagen-Rubens 2 sqrt(2 eps0 w/sigma) gives 1.517246e-3
    f = np.array([300e9])
    index = np.sqrt(Constant(1.0, 0.0, 5.8e7)(f))
    assert_allclose(1.0 - abs((index - 1) / (index + 1)) ** 2, 1.516095e-3, rtol=1e-5)
    assert_allclose(2 * np.sqrt(2 * EPS0 * TWO_PI * f / 5.8e7), 1.517246e-3, rtol=1e-6)


def test_loss_tangent_and_conductivity_add():
    eps = Constant(2.0, 0.1, 3.0)(np.array([1e9, 2e9]))
    assert_allclose(eps.real, 2.0)
    assert_allclose(eps.imag, 0.2 + 3.0 / (TWO_PI * np.array([1e9, 2e9]) * EPS0), rtol=1e-14)


@pytest.mark.parametrize(
    "model",
    [
        Constant(2.0, 0.1, 3.0),
        Drude(1e15, 1e13),
        Lorentz(2.1, (Oscillator(1e12, 0.4, 20e9),)),
        Debye(78.0, 5.2, 8.3e-12),
        Sellmeier((0.7,), (0.07e-6,)),
        ResonantPermeability(1e10, 0.3, 1e8),
    ],
)
def test_every_model_is_passive_and_keeps_the_shape(model):
    frequency = np.random.default_rng(1).uniform(1e9, 1e14, (3, 7))
    values = model(frequency)
    assert values.shape == (3, 7)
    assert np.all(values.imag >= 0.0)
