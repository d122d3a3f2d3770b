"""The elementary functions against mpmath, in units of the last place over the range that the kernels use."""

import mpmath as mp
import numpy as np
import pytest
from numba import njit

from slabsim.engine import vector_math


@njit
def _decay(x):
    return vector_math.decay(x)


@njit
def _sincos(x):
    return vector_math.sincos(x)


@njit
def _root(z):
    return vector_math.root(z)


def points(low, high, n=400):
    """Random numbers between two powers of ten."""
    return 10 ** np.random.default_rng(5).uniform(low, high, n)


def test_decay_is_good_to_two_units_in_the_last_place():
    for x in -np.concatenate([points(-12, 0), points(0, 2.8), [0.3466, 0.34658, 0.69315]]):
        em1, e = _decay(x)
        assert abs(em1 / mp.expm1(mp.mpf(x)) - 1) < 2 * 2.3e-16
        assert abs(e / mp.exp(mp.mpf(x)) - 1) < 2 * 2.3e-16


@pytest.mark.parametrize("x", [-709.0, -1e4, -1e300])
def test_deep_decay_ends_above_zero(x):
    em1, e = _decay(x)
    assert em1 == -1.0
    assert 0.0 < e < 1e-300


def test_sine_and_cosine_are_good_to_one_unit_of_one():
    for x in np.concatenate([points(-8, 6), -points(-8, 2), np.arange(0, 40) * np.pi / 4]):
        sine, cosine = _sincos(x)
        assert abs(sine - mp.sin(mp.mpf(x))) < 1.2e-16
        assert abs(cosine - mp.cos(mp.mpf(x))) < 1.2e-16


def test_root_has_three_digits_of_the_last_place_and_decays():
    rng = np.random.default_rng(6)
    for size in points(-30, 30):
        z = size * np.exp(1j * rng.uniform(-np.pi, np.pi))
        root, inverse = _root(z)
        expected = mp.sqrt(mp.mpc(z))
        expected = expected if mp.im(expected) >= 0 else -expected
        assert abs(root - expected) < 5e-16 * abs(expected)
        assert abs(inverse * abs(mp.mpc(z)) - 1) < 1e-15
        assert root.imag >= 0.0


@pytest.mark.parametrize(("z", "expected"), [(4 + 0j, 2), (-4 + 0j, 2j), (complex(-4, -0.0), 2j), (0j, 0)])
def test_root_on_the_axes(z, expected):
    assert abs(_root(z)[0] - expected) < 1e-69
