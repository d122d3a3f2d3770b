"""Lattice constants and wire impedances of the reference, against tabulated values."""

import math

import mpmath as mp
import pytest
from numpy.testing import assert_allclose

from tests.reference import lattice


@pytest.mark.parametrize(
    ("ratio", "value"),
    [
        (1, 0.527344140498),
        (2, 0.700630935638),
        (0.5, 0.700630935638),
        (3, 1.021490195486),
        (0.2, 1.813274921774),
    ],
)
def test_lattice_constant(ratio, value):
    # -ln[sqrt(u) eta(iu)^2] with Dedekind's eta function, derived here
    assert_allclose(float(lattice.lattice_constant(ratio)), value, rtol=0, atol=1e-11)


def test_square_lattice_constant_in_gamma_functions():
    square = -2 * mp.log(mp.gamma(0.25) / (2 * mp.pi**0.75))
    assert_allclose(float(lattice.lattice_constant(1)), float(square), rtol=1e-14)


@pytest.mark.parametrize(
    ("radius", "logarithmic", "lattice_sum", "gap"),
    [  # pitch 10 mm; derived here
        (0.1e-3, 116.80652, 138.09760, 139.49572),
        (0.5e-3, 144.82330, 193.09201, 194.50925),
        (1e-3, 165.18937, 251.66492, 247.99253),
    ],
)
def test_plasma_wavenumbers(radius, logarithmic, lattice_sum, gap):
    found = [
        lattice.kp_logarithmic(0.01, radius),
        lattice.kp_lattice(0.01, 0.01, radius),
        lattice.kp_gap(0.01, radius),
    ]
    assert_allclose([float(kp) for kp in found], [logarithmic, lattice_sum, gap], rtol=5e-8)


def test_plasma_wavenumber_of_a_rectangular_lattice():
    both = [lattice.kp_lattice(0.01, 0.005, 1e-4), lattice.kp_lattice(0.005, 0.01, 1e-4)]
    assert_allclose([float(kp) for kp in both], 200.64746, rtol=5e-8)
    assert_allclose(float(both[0]), float(both[1]), rtol=1e-14)


@pytest.mark.parametrize(
    ("radius_over_depth", "ratio"),
    [
        (0.5, 1.001301),
        (1, 1.020492),
        (2, 1.264643),
        (3, 1.768132),
        (5, 2.768108),
        (10, 5.259302),
        (20, 10.254679),
        (100, 50.250937),
    ],
)
def test_skin_effect_of_a_copper_wire(radius_over_depth, ratio):
    # Rac/Rdc = Re[x J0(x) / (2 J1(x))], x = (1 + i) r / depth, derived here
    conductivity, k0 = 5.8e7, 2 * math.pi * 1e9 / 299_792_458.0
    depth = math.sqrt(2 / (conductivity * k0 * float(lattice.ETA0)))
    radius = radius_over_depth * depth
    impedance = lattice.round_wire_impedance(lattice.eps_of_conductor(conductivity, k0), radius, k0)
    dc = 1 / (conductivity * math.pi * radius**2)
    assert_allclose(float(impedance.real) / dc, ratio, rtol=0, atol=1e-6)
    assert impedance.imag < 0  # inductive in exp(-i w t)


def test_thin_wires_have_the_resistance_of_their_cross_section():
    eps, k0 = lattice.eps_of_conductor(1e5, 20.0), 20.0
    skin, thin = (f(eps, 1e-5, k0) for f in (lattice.round_wire_impedance, lattice.thin_wire_impedance))
    assert_allclose(complex(skin), complex(thin), rtol=0.02)
    assert_allclose(float(thin.real), 1 / (1e5 * math.pi * 1e-10), rtol=1e-12)


def test_thin_wires_count_the_current_beyond_their_hosts():
    eps, radius, k0 = -1300 + 20j, 1e-9, 2 * math.pi / 5e-6  # skin depth about 20 nm
    for eps_host in (1, 2.22):
        skin = lattice.round_wire_impedance(eps, radius, k0, eps_host)
        thin = lattice.thin_wire_impedance(eps, radius, k0, eps_host)
        assert_allclose(complex(skin), complex(thin), rtol=5e-4)
        assert_allclose(complex(thin * math.pi * radius**2 * k0 / lattice.ETA0), 1j / (eps - eps_host), rtol=1e-12)


def test_local_permittivity_along_lossless_wires():
    assert_allclose(complex(lattice.local_eps_zz(2.25, 138, 0, 50)), 2.25 - 2.76**2, rtol=1e-14)
