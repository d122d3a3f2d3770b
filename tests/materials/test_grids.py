"""The impedance of a plane of wires against handbook forms and sums over the wires themselves."""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.errors import InputError
from slabsim.materials.grids import diffracts, grid_impedance
from slabsim.materials.sheets import strip_admittance
from tests.reference.grids import hankel_grid, spectral_grid

A, RADIUS, ETA0, C0 = 10e-3, 0.1e-3, 376.730313668, 299_792_458


def impedance(k0, along=0.0, across=0.0, eps=(1.0, 1.0), mu=(1.0, 1.0), **more):
    values = (np.array(value) for value in (k0, along, across))
    pairs = (tuple(np.array(value, dtype=complex) for value in pair) for pair in (eps, mu))
    return complex(grid_impedance(A, RADIUS, *values, *pairs, **more))


def test_value_at_3_ghz():
    # derived: -104.552871 i ohm with the full sum (104.324492 from the logarithm alone), T = 0.235524
    z = impedance(2 * np.pi * 3e9 / C0)
    assert_allclose(z * ETA0, -104.552871j, rtol=1e-8)
    assert_allclose(abs(1 / (1 + 1 / (2 * z))) ** 2, 0.235524, atol=1e-6)


@pytest.mark.parametrize(
    ("k0", "along", "across", "eps"),
    [
        (60.0, 0.0, 0.0, 1.0),
        (60.0, 0.0, 0.5, 1.0),
        (100.0, 0.4, 0.3, 2.25),
        (150.0, 0.6, 0.0, 1.0),
        (300.0, 0.1, 0.7, 1.0),
    ],
)
def test_orders_of_diffraction_give_what_the_fields_of_the_wires_give(k0, along, across, eps):
    assert_allclose(impedance(k0, along, across, (eps, eps)), hankel_grid(A, RADIUS, k0, along, across, eps), rtol=1e-9)


@pytest.mark.parametrize("seed", range(6))
def test_between_two_media_the_accelerated_sum_is_the_long_one(seed):
    rng = np.random.default_rng(seed)
    k0, (along, across) = rng.uniform(10, 200), rng.uniform(-0.8, 0.8, 2)
    eps = (rng.uniform(1, 2), rng.uniform(1, 3) + 0.1j)
    mu = (1.0, rng.uniform(0.8, 1.5))
    assert_allclose(
        impedance(k0, along, across, eps, mu), spectral_grid(A, RADIUS, k0, along, across, eps, mu), rtol=1e-12
    )


@pytest.mark.parametrize("eps_behind", [4 + 100j, 1 + 3000j, -30 + 0.5j, -1000 + 5j, 1 + 1e4j])
@pytest.mark.parametrize(("k0", "along", "across"), [(30.0, 0.5, 0.3), (100.0, 0.0, 0.0), (250.0, 0.0, 0.8)])
def test_beside_a_conductor_the_sum_goes_as_far_as_its_skin_depth_asks(k0, along, across, eps_behind):
    # |k a/2 pi| up to 40: orders well beyond the first few count
    eps, mu = (1.0, eps_behind), (1.0, 1.0)
    expected = spectral_grid(A, RADIUS, k0, along, across, eps, mu, terms=40_000)
    assert_allclose(impedance(k0, along, across, eps), expected, rtol=1e-10)


def test_beside_ever_better_conductors_the_grid_stays_passive_and_small():
    for exponent in range(1, 10):
        z = impedance(250.0, 0.0, 0.3, (1.0, 1.0 + 10.0**exponent * 1j))
        assert z.real > 0.0
        assert abs(z) < 3.0


@pytest.mark.parametrize("along", [0.0, 0.6])
def test_a_dense_grid_obeys_the_averaged_boundary_condition(along):
    # Kontorovich, from memory: E.n = -i (k0 a/2 pi) ln(a/(2 pi r)) (1 + dd/k^2) J, k^2 that of the mean permittivity
    k0, eps = 0.5, (1.0, 3.4)
    expected = -1j * (k0 * A / (2 * np.pi)) * np.log(A / (2 * np.pi * RADIUS)) * (1 - along**2 / 2.2)
    assert_allclose(impedance(k0, along, 0.2, eps), expected, rtol=1e-5)


def test_a_wire_acts_as_a_strip_four_radii_wide():
    # classical equivalence; the strips in turn are dual to patches (Babinet), in a module of their own
    k0, thin = np.array([0.5]), 1e-5
    one = np.ones(1, dtype=complex)
    y, _ = strip_admittance(A, 4 * thin, k0, one, 2.0 * one)
    pair, still = (one, 2.0 * one), np.zeros(1)
    assert_allclose(grid_impedance(A, thin, k0, still, still, pair, (one, one)), 1 / y, rtol=1e-5)


def test_a_lossless_grid_only_stores_energy_below_the_onset():
    k0, across = np.linspace(10, 500, 20)[:, None], np.linspace(0, 0.7, 9)[None, :]
    one = (np.array(1.0 + 0j),) * 2
    z = grid_impedance(A, RADIUS, k0, 0.3 + 0.0 * across, across, one, one)
    below = ~diffracts(A, k0, 0.3 + 0.0 * across, across, one, one)
    assert np.max(abs(z.real[below])) < 1e-14
    assert np.any(below)
    assert np.any(~below)


def test_the_wires_own_impedance_adds():
    assert_allclose(impedance(60.0, wire=0.01 - 0.02j) - impedance(60.0), 0.01 - 0.02j, rtol=1e-12)


def test_touching_wires_are_refused():
    with pytest.raises(
        InputError, match="radius = 5 mm with pitch = 10 mm; the radius must be positive and less than half"
    ):
        grid_impedance(A, A / 2, *(np.array(0.1),) * 3, *((np.array(1 + 0j),) * 2,) * 2)
