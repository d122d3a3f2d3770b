"""Half-spaces and layers without wires in the reference solver, against textbook formulas."""

import cmath
import math

import mpmath as mp
import pytest
from numpy.testing import assert_allclose

from tests.reference.dense import HalfSpace, Slab, solve

AIR = HalfSpace()


@pytest.mark.parametrize(
    ("theta_deg", "R_te", "R_tm"),
    [
        (30, 0.0577961054, 0.0252491465),
        (45, 0.0920133631, 0.0084664590),
        (60, 0.1765714881, 0.0018019375),
        (80, 0.5385949057, 0.2368138036),
    ],
)
def test_fresnel(theta_deg, R_te, R_tm):  # 1 to 1.5, textbook
    for polarization, R in (("TE", R_te), ("TM", R_tm)):
        response = solve(AIR, [], HalfSpace(2.25, 1), 1.0, math.radians(theta_deg), polarization)
        assert_allclose(response.R, R, rtol=0, atol=1e-10)
        assert_allclose(response.T, 1 - R, rtol=0, atol=1e-10)


def test_amplitudes_at_one_interface_are_those_of_the_electric_field():
    theta, n, mu = 0.7, 2.0, 1.6  # Fresnel with eta = sqrt(mu/eps): E amplitudes
    inside, eta = math.asin(math.sin(theta) / n), mu / n
    response = solve(AIR, [], HalfSpace(n**2 / mu, mu), 1.0, theta, "TM")
    y, y0 = 1 / (eta * math.cos(inside)), 1 / math.cos(theta)
    assert_allclose(response.r, (y - y0) / (y + y0), rtol=1e-14)
    assert_allclose(response.t, (1 + response.r) * eta, rtol=1e-14)
    te = solve(AIR, [], HalfSpace(n**2 / mu, mu), 1.0, theta, "TE")
    y, y0 = math.cos(inside) / eta, math.cos(theta)
    assert_allclose([te.r, te.t], [(y0 - y) / (y0 + y), 2 * y0 / (y0 + y)], rtol=1e-14)


@pytest.mark.parametrize(("n_pairs", "R"), [(1, 0.3374508449), (2, 0.6512118431), (5, 0.9724312379)])
def test_quarter_wave_stack(n_pairs, R):
    # R = ((1 - Y)/(1 + Y))^2, Y = (nH/nL)^2N 1.52; nH = 2.3, nL = 1.46
    pair = [Slab(n**2, 1, math.pi / (2 * n)) for n in (2.3, 1.46)]
    for polarization in ("TE", "TM"):
        response = solve(AIR, pair * n_pairs, HalfSpace(1.52**2, 1), 1.0, 0, polarization)
        assert_allclose(response.R, R, rtol=0, atol=1e-10)


@pytest.mark.parametrize(
    ("polarization", "powers"),
    [
        ("TM", (0.0410858683, 0.6359658612, 0.3229482705)),
        ("TE", (0.1453987610, 0.5605101582, 0.2940910809)),
    ],
)
def test_absorbing_layer_on_glass(polarization, powers):
    # n = 2 + 0.1i, 0.3 wavelengths thick, on 1.5, 40 degrees; Airy sum, derived here
    film = Slab((2 + 0.1j) ** 2, 1, 0.3)
    response = solve(AIR, [film], HalfSpace(2.25, 1), 2 * math.pi, math.radians(40), polarization)
    assert_allclose([response.R, response.T, response.A], powers, rtol=0, atol=1e-10)
    assert_allclose(response.absorbed[0], response.A, rtol=1e-14)


@pytest.mark.parametrize("polarization", ["TE", "TM"])
def test_slab_of_index_minus_one_reverses_the_phase(polarization):
    theta = 0.6
    response = solve(AIR, [Slab(-1, -1, 0.4)], AIR, 20.0, theta, polarization)
    assert abs(response.r) < 1e-25
    assert_allclose(response.t, cmath.exp(-8j * math.cos(theta)), rtol=1e-14)
    onto = solve(AIR, [], HalfSpace(-1, -1), 20.0, theta, polarization)
    assert_allclose([abs(onto.r), onto.t, onto.T], [0, 1, 1], atol=1e-25)


@pytest.mark.parametrize("polarization", ["TE", "TM"])
@pytest.mark.parametrize("medium", [(-20 + 1e-3j, 1), (3 + 40j, 1), (2.5, -3 + 0.01j), (-2 + 0.1j, -1.5 + 0.2j)])
def test_thick_opaque_layer_reflects_as_its_half_space(polarization, medium):
    thick = solve(AIR, [Slab(*medium, 200.0)], HalfSpace(3, 1), 2.0, 1.1, polarization)
    half_space = solve(AIR, [], HalfSpace(*medium), 2.0, 1.1, polarization)
    assert_allclose(thick.r, half_space.r, rtol=1e-14)
    assert_allclose(half_space.R + half_space.T, 1, rtol=1e-14)
    assert_allclose(thick.absorbed[0], half_space.T, rtol=1e-14)


@pytest.mark.parametrize("polarization", ["TE", "TM"])
def test_total_reflection_sends_nothing_behind(polarization):
    response = solve(HalfSpace(4, 1), [], AIR, 2.0, 0.9, polarization)
    assert_allclose(response.R, 1, rtol=1e-15)
    assert response.T == 0


def test_a_layer_without_thickness_is_not_there():
    for polarization in ("TE", "TM"):
        bare, layered = (
            solve(AIR, stack, HalfSpace(3 + 1j, 1), 2.0, 0.9, polarization) for stack in ([], [Slab(5 + 1j, 2, 0)])
        )
        assert_allclose([layered.r, layered.t], [bare.r, bare.t], rtol=1e-15)


def test_grazing_incidence_keeps_the_digits_of_the_cosine():
    # 1 + r -> 2 y0/(y0 + y) with y0 = cos(theta) = 1e-25, dielectric of index 1.5 in TE
    with mp.workdps(60):
        theta = mp.pi / 2 - mp.mpf("1e-25")
    response = solve(AIR, [], HalfSpace(2.25, 1), 1.0, theta, "TE")
    assert_allclose(response.t, 2e-25 / math.sqrt(1.25), rtol=1e-14)
