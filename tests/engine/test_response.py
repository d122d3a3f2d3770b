import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.engine.fields import absorbed_by_element
from slabsim.engine.pack import pack
from slabsim.engine.response import Solver
from slabsim.errors import InputError
from slabsim.stack.sample import Layer
from tests.engine.twins import medium, stack, wires

SAMPLE = stack(Layer("plate", medium(2.0 + 0.1j), 3e-3), Layer("wires", medium(1.5), 9e-3, wires(3e-3, 0.1e-3)))


@pytest.mark.parametrize(
    ("n_freqs", "n_angles"), [(1, 1), (1, 63), (63, 1), (2, 64), (64, 2), (65, 3), (3, 65), (130, 129)]
)
def test_every_shape_of_grid_gives_the_numbers_of_its_points(n_freqs, n_angles):
    f, angles = np.linspace(5e9, 30e9, n_freqs), np.linspace(0, 80, n_angles)
    response = Solver(SAMPLE).solve(f, angles)
    assert response.t.shape == response.R.shape == (2, n_freqs, n_angles)
    for i, j in ((0, 0), (-1, -1), (n_freqs // 2, n_angles // 3)):
        point = Solver(SAMPLE).solve(f[i], angles[j])
        assert_allclose(response.r[:, i, j], point.r[:, 0, 0], atol=1e-14)
        assert_allclose(response.t[:, i, j], point.t[:, 0, 0], atol=1e-14)


def test_powers_are_those_of_the_amplitudes():
    response = Solver(SAMPLE).solve([10e9, 20e9], [0.0, 50.0])
    assert_allclose(response.R, abs(response.r) ** 2, atol=1e-15)
    assert_allclose(response.T, abs(response.t) ** 2, atol=1e-15)
    assert_allclose(response.A, 1 - response.R - response.T, atol=1e-15)


@pytest.mark.parametrize("chosen", [("TE",), ("TM",), ("TM", "TE")])
def test_polarizations_come_in_the_order_asked_for(chosen):
    both, some = Solver(SAMPLE).solve(10e9, 50.0), Solver(SAMPLE, polarizations=chosen).solve(10e9, 50.0)
    assert some.channels == some.incident == chosen
    assert np.array_equal(some.r, both.r[[("TE", "TM").index(name) for name in chosen]])


def test_nothing_is_transmitted_into_a_perfect_conductor():
    response = Solver(stack(*SAMPLE.elements, back=None)).solve(10e9, 30.0)
    assert response.t is None
    assert response.T is None
    assert_allclose(response.A, 1 - response.R, atol=1e-15)


def test_amplitudes_are_electric_also_behind_a_dense_back():
    # normal incidence 1 to 4: t = 2/(1 + 2) for E (Fresnel, textbook), for both polarizations
    assert_allclose(Solver(stack(back=medium(4.0))).solve(1e9, 0.0).t, 2 / 3, atol=1e-15)


def test_layers_that_are_equal_share_a_table():
    layer = Layer("a", medium(2.0), 1e-3, wires(2e-3, 0.1e-3))
    recipe = pack(stack(layer, layer, layer), "nonlocal", np.array([1e9]))
    assert recipe.tables.shape[0] == 1
    assert recipe.kinds.size == 3


@pytest.mark.parametrize("angle", [90.0, -1.0, 120.0, float("nan")])
def test_angles_out_of_bounds_are_refused(angle):
    with pytest.raises(InputError, match="every angle must satisfy 0 <= angle < 90"):
        Solver(SAMPLE).solve(1e9, angle)


@pytest.mark.parametrize("frequency", [0.0, -1e9, float("nan"), float("inf")])
def test_frequencies_out_of_bounds_are_refused(frequency):
    with pytest.raises(InputError, match="every frequency must be positive and finite"):
        Solver(SAMPLE).solve(frequency, 0.0)


def test_unknown_models_and_polarizations_are_refused():
    with pytest.raises(InputError, match="it must be 'nonlocal' or 'local'"):
        Solver(SAMPLE, "corrected")
    with pytest.raises(InputError, match="each must be 'TE' or 'TM'"):
        Solver(SAMPLE, polarizations=("te",))
    with pytest.raises(InputError, match="it must be 'TE' or 'TM'"):
        absorbed_by_element(SAMPLE, 1e9, 0.0, "te")


def test_absorption_of_the_layers_sums_to_that_of_the_stack():
    angles = np.linspace(0, 85, 150)
    absorbed = absorbed_by_element(SAMPLE, 12e9, angles, "TM")
    assert absorbed.shape == (2, 150)
    assert_allclose(absorbed.sum(axis=0), Solver(SAMPLE).solve(12e9, angles).A[1, 0], atol=1e-13)
    assert np.max(abs(absorbed[1])) < 1e-13  # ideal wires in a lossless host
