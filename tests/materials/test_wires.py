"""Plasma wavenumber and internal impedance against closed and published values."""

from math import exp, gamma, log, pi, sqrt

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.special import jv

from slabsim.constants import C0, EPS0, ETA0, MU0, TWO_PI
from slabsim.errors import InputError, MaterialError
from slabsim.materials.dispersion import Constant, Drude
from slabsim.materials.material import Material
from slabsim.materials.wires import fill_fraction, internal_impedance, lattice_constant, plasma_wavenumber

COPPER = Constant(1.0, 0.0, 5.8e7)
SKIN_DEPTH = sqrt(2.0 / (TWO_PI * 1e9 * MU0 * 5.8e7))  # of copper at 1 GHz


def test_lattice_constant_of_the_square_lattice():
    # closed form -2 ln[Gamma(1/4)/(2 pi^(3/4))]; Belov et al., PRB 67, 113103 (2003) print 0.5275
    assert_allclose(lattice_constant(1.0), -2.0 * log(gamma(0.25) / (2.0 * pi**0.75)), atol=1e-13)


@pytest.mark.parametrize("aspect", [1.0, 2.0, 3.0, 0.2, 17.0, 1e3])
def test_lattice_constant_is_the_logarithm_of_the_dedekind_eta_function(aspect):
    u = max(aspect, 1.0 / aspect)
    product = np.prod([1.0 - exp(-2.0 * pi * n * u) for n in range(1, 40)])
    log_eta = -pi * u / 12.0 + log(product)
    assert_allclose(lattice_constant(aspect), -0.5 * log(u) - 2.0 * log_eta, atol=1e-12)


def test_lattice_constants_of_rectangles():
    # derived here by both routes above
    values = [lattice_constant(u) for u in (2.0, 0.5, 3.0, 0.2)]
    assert_allclose(values, [0.700630935638, 0.700630935638, 1.021490195486, 1.813274921774], atol=1e-11)


@pytest.mark.parametrize(
    ("radius", "logarithmic", "lattice", "gap"),
    [
        # pitch 10 mm; closed formulas
        (0.1e-3, 116.80652, 138.09760, 139.49572),
        (0.5e-3, 144.82330, 193.09201, 194.50925),
        (1.0e-3, 165.18937, 251.66492, 247.99253),
    ],
)
def test_plasma_wavenumber_of_the_three_formulas(radius, logarithmic, lattice, gap):
    assert_allclose(plasma_wavenumber(10e-3, radius, "logarithmic"), logarithmic, rtol=1e-7)
    assert_allclose(plasma_wavenumber(10e-3, radius, "lattice"), lattice, rtol=1e-7)
    assert_allclose(plasma_wavenumber(10e-3, radius, "gap"), gap, rtol=1e-7)


def test_the_published_microwire_example():
    # Pendry et al., PRL 76, 4773 (1996): a = 5 mm, r = 1 um gives 8.2 GHz (value from memory)
    kp = plasma_wavenumber(5e-3, 1e-6, "logarithmic")
    assert_allclose(kp * C0 / TWO_PI, 8.19620e9, rtol=1e-5)


def test_the_plasma_edge_in_a_dense_host():
    # pitch 2 mm, radius 0.05 mm, eps 10.2: fp/sqrt(eps), closed formulas
    edges = [plasma_wavenumber(2e-3, 0.05e-3, form) * C0 / TWO_PI / sqrt(10.2) for form in ("lattice", "gap")]
    assert_allclose(edges, [12.14124e9, 12.27208e9], rtol=1e-6)


def test_line_constants_follow_from_the_plasma_wavenumber():
    # L = mu0/(A kp^2), C = eps0 A kp^2 for pitch 10 mm, radius 0.1 mm, gap formula
    area_kp2 = 1e-4 * plasma_wavenumber(10e-3, 0.1e-3, "gap") ** 2
    assert_allclose((MU0 / area_kp2, EPS0 * area_kp2), (6.457852e-7, 1.722941e-11), rtol=2e-7)


def test_a_rectangular_cell_may_be_turned():
    kp = plasma_wavenumber((10e-3, 5e-3), 0.1e-3)
    assert_allclose(kp, 200.64746, rtol=1e-7)
    assert_allclose(plasma_wavenumber((5e-3, 10e-3), 0.1e-3), kp, rtol=1e-13)


@pytest.mark.parametrize("formula", ["logarithmic", "gap"])
def test_square_formulas_take_the_square_of_equal_area(formula):
    assert_allclose(
        plasma_wavenumber((8e-3, 2e-3), 0.1e-3, formula), plasma_wavenumber(4e-3, 0.1e-3, formula), rtol=1e-14
    )


def test_a_measured_plasma_frequency_includes_the_host():
    foam = Material("foam", Constant(2.25, 0.01))
    assert_allclose(plasma_wavenumber(1e-2, 1e-4, 12.3e9, foam), TWO_PI * 12.3e9 * 1.5 / C0, rtol=1e-14)


def test_a_plasma_edge_needs_a_transparent_host():
    metal = Material("metal", Drude(1e15, 1e13))
    with pytest.raises(MaterialError, match=r'"metal" has Re\(eps\) = .* at the plasma frequency 12 GHz'):
        plasma_wavenumber(1e-2, 1e-4, 12e9, metal)


@pytest.mark.parametrize("radius", [0.0, -1e-3, 5e-3, np.nan])
def test_wires_that_touch_or_have_no_radius_are_refused(radius):
    with pytest.raises(InputError, match="less than half the smaller pitch"):
        plasma_wavenumber((10e-3, 12e-3), radius)


def test_an_unknown_formula_is_refused_with_the_known_ones():
    with pytest.raises(InputError, match="must be one of lattice, logarithmic, gap"):
        plasma_wavenumber(10e-3, 1e-3, "latice")  # type: ignore[arg-type]


def test_the_thin_wire_formula_refuses_thick_wires():
    # ln(a/(2 pi r)) + F(1) < 0 beyond r/a = exp(F(1))/(2 pi) = 0.2697
    with pytest.raises(InputError, match=r"the lattice formula has no solution at radius = 2\.7 mm, pitch"):
        plasma_wavenumber(10e-3, 2.7e-3)
    assert plasma_wavenumber(10e-3, 2.69e-3) > 0.0


def test_fill_fraction():
    assert_allclose(fill_fraction((2e-3, 3e-3), 0.5e-3), pi / 24.0, rtol=1e-14)
    assert_allclose(fill_fraction(2e-3, 0.5e-3), pi / 16.0, rtol=1e-14)


@pytest.mark.parametrize(
    ("ratio", "resistance"),
    [
        # R_ac/R_dc of a round wire over r/delta, ka J0(ka)/(2 J1(ka)), ka = (1 + i) r/delta
        (0.5, 1.001301),
        (1.0, 1.020492),
        (1.5, 1.097328),
        (2.0, 1.264643),
        (3.0, 1.768132),
        (4.0, 2.273801),
        (5.0, 2.768108),
        (6.0, 3.265194),
        (8.0, 4.261570),
        (10.0, 5.259302),
        (20.0, 10.254679),
        (50.0, 25.251874),
        (100.0, 50.250937),
    ],
)
def test_skin_effect_resistance(ratio, resistance):
    radius = ratio * SKIN_DEPTH
    impedance = internal_impedance(radius, COPPER(np.array([1e9])), np.array([1e9]))[0]
    assert_allclose(impedance.real * 5.8e7 * pi * radius**2, resistance, rtol=1e-6)


@pytest.mark.parametrize(
    ("x", "resistance"), [(1, 1.005), (2, 1.078), (3, 1.318), (5, 2.043), (10, 3.799), (20, 7.328)]
)
def test_skin_effect_of_the_handbooks(x, resistance):
    # x = sqrt(2) r/delta; handbook values from memory
    radius = x / sqrt(2.0) * SKIN_DEPTH
    impedance = internal_impedance(radius, COPPER(np.array([1e9])), np.array([1e9]))[0]
    assert_allclose(impedance.real * 5.8e7 * pi * radius**2, resistance, rtol=5e-4)


@pytest.mark.parametrize(("ratio", "inductance"), [(1, 0.989768), (2, 0.870483), (5, 0.396276), (10, 0.199585)])
def test_internal_inductance(ratio, inductance):
    # over mu0/(8 pi), which it has at direct current; exp(-i w t), so an inductance is -i w L
    impedance = internal_impedance(ratio * SKIN_DEPTH, COPPER(np.array([1e9])), np.array([1e9]))[0]
    assert_allclose(-impedance.imag / (TWO_PI * 1e9) / (MU0 / (8.0 * pi)), inductance, rtol=2e-6)


def test_a_copper_wire_at_2_ghz():
    impedance = internal_impedance(0.1e-3, COPPER(np.array([2e9])), np.array([2e9]))
    assert_allclose(impedance, [18.707497 - 18.568762j], rtol=1e-7)  # closed formula


@pytest.mark.parametrize("ratio", [1e3, 9.9e3, 1.01e4, 1e6, 1e9, 1e12])
def test_very_thick_wires_neither_overflow_nor_lose_digits(ratio):
    # r/(2 delta) + 1/4 + 3 delta/(32 r): the large-argument expansion of the resistance
    radius = ratio * SKIN_DEPTH
    impedance = internal_impedance(radius, COPPER(np.array([1e9])), np.array([1e9]))[0]
    expected = ratio / 2.0 + 0.25 + 3.0 / (32.0 * ratio)
    # delta above neglects the displacement current, 1e-9 of the conduction current
    assert_allclose(impedance.real * 5.8e7 * pi * radius**2, expected, rtol=5e-9)


def test_the_two_evaluations_meet_where_they_are_exchanged():
    # z = i y: J0/J1 = -i I0(y)/I1(y)
    from scipy.special import ive

    for y in (9.99e3, 1.001e4):
        eps = -np.array([1e4]) + 0j
        frequency = np.array([1e9])
        radius = y / (TWO_PI * 1e9 / C0 * 100.0)
        got = internal_impedance(radius, eps, frequency)[0]
        sigma = -1j * TWO_PI * 1e9 * EPS0 * (eps[0] - 1.0)
        want = 1j * y * -1j * ive(0, y) / ive(1, y) / (TWO_PI * radius**2 * sigma)
        assert_allclose(got, want, rtol=1e-11)


def test_a_thin_wire_has_the_resistance_of_its_cross_section():
    gold = Drude(1.37e16 / TWO_PI, 4.05e13 / TWO_PI)
    frequency = np.array([1e11, 1e12])
    radius = 1e-10
    sigma = -1j * TWO_PI * frequency * EPS0 * (gold(frequency) - 1.0)
    assert_allclose(internal_impedance(radius, gold(frequency), frequency), 1.0 / (sigma * pi * radius**2), rtol=1e-5)


def test_a_dielectric_fibre_follows_the_plain_bessel_functions():
    frequency = np.array([1e9, 3e9, 9e9])
    eps = np.array([12.0 + 0.5j] * 3)
    km = TWO_PI * frequency / C0 * np.sqrt(eps)
    sigma = -1j * TWO_PI * frequency * EPS0 * (eps - 2.0)
    want = km * jv(0, km * 1e-2) / (TWO_PI * 1e-2 * sigma * jv(1, km * 1e-2))
    assert_allclose(internal_impedance(1e-2, eps, frequency, 2.0), want, rtol=1e-12)


def test_a_thick_wire_has_the_surface_impedance_of_a_plane():
    # Zs = eta0/sqrt(eps), spread over the circumference; frequency 10 GHz, radius 1 m
    frequency = np.array([10e9])
    eps = COPPER(frequency)
    assert_allclose(internal_impedance(1.0, eps, frequency), ETA0 / np.sqrt(eps) / TWO_PI, rtol=1e-5)
