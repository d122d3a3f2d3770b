"""Cut-off, resonance, grazing, coalescing modes, thin and thick layers: where formulas like to lose their digits."""

from dataclasses import replace

import numpy as np
import pytest

from slabsim.engine.response import Solver
from slabsim.stack.sample import Layer, WireSet
from tests.engine.twins import C0, GROUNDED, JOINED, OPEN, medium, reference, stack

F = C0 / (2 * np.pi)  # k0 = 1 rad/m: lengths are phases
OFFSETS = (0.0, 1e-13, 1e-9, 1e-5, 1e-2)


def wire_layer(eps, kp, depth, zc=0.0, ends=(OPEN, OPEN)) -> Layer:
    """Wires of a given kp [rad/m] in a host, `depth` = k0 d, with zc = i zeta kp^2/k0."""
    pitch, radius = 1e-9, 1e-13
    fill = np.pi * radius**2 / pitch**2
    metal = medium(eps - kp**2 / (fill * zc), name="metal") if zc else None
    plasma = kp * C0 / (2 * np.pi) / np.sqrt(complex(eps).real)
    return Layer("wires", medium(eps), depth, (WireSet((pitch, pitch), radius, metal, ends, plasma),))


def error(sample, angle_deg, polarization="TM") -> float:
    """Largest distance from the dense solution in r and t."""
    response = Solver(sample, polarizations=(polarization,)).solve(F, angle_deg)
    expected = reference(sample, F, angle_deg, polarization)
    distance = abs(response.r[0, 0, 0] - expected.r)
    return max(distance, 0.0 if expected.t is None else abs(response.t[0, 0, 0] - expected.t))


@pytest.mark.parametrize("offset", OFFSETS)
@pytest.mark.parametrize("depth", [1e-3, 0.7, 20.0])
def test_tm_cut_off(offset, depth):
    s = 0.5
    layer = wire_layer(4.0, np.sqrt(4.0 - s**2) * (1 + offset), depth)
    assert error(stack(layer), 30.0) < 1e-11


@pytest.mark.parametrize("offset", OFFSETS)
@pytest.mark.parametrize("order", [1, 2, 7])
def test_tem_resonance(offset, order):
    layer = wire_layer(2.25, 5.0, order * np.pi / 1.5 * (1 + offset))
    assert error(stack(layer), 60.0) < 1e-11


@pytest.mark.parametrize("angle_deg", [0.0, 1e-9, 1e-5, 89.9, 89.999, 89.9999999])
def test_normal_and_grazing_incidence(angle_deg):
    sample = stack(Layer("air", medium(1.0), 3.0), wire_layer(2.0, 4.0, 1.1), Layer("plate", medium(3.0), 0.4))
    for polarization in ("TE", "TM"):
        assert error(sample, angle_deg, polarization) < 1e-10


@pytest.mark.parametrize("offset", [0.0, 1e-12, 1e-9, 1e-6, 1e-4, 1e-3, 1e-2])
@pytest.mark.parametrize("depth", [1e-6, 0.03, 0.8, 30.0, 900.0])
@pytest.mark.parametrize("ends", [(OPEN, OPEN), (GROUNDED, OPEN), (GROUNDED, GROUNDED)])
def test_coalescing_modes(offset, depth, ends):
    # the modes coalesce where (A - B)^2 + 4 c^2 = 0 with c = s kp, that is eps zc = kp^2 - s^2 + 2i s kp
    s, kp, eps = 0.5, 0.9, 2.0
    zc = np.conj((kp**2 - s**2 - 2j * s * kp * (1 + offset)) / eps)
    layer = wire_layer(eps, kp, depth, zc, ends)
    back = None if ends[1] is GROUNDED else medium(1.0)
    sample = stack(layer, back=back) if ends[0] is OPEN else stack(_film(), layer, back=back)
    assert error(sample, 30.0) < 1e-11


def _film():
    from slabsim.stack.sample import Film

    return Film("film", 500.0)


@pytest.mark.parametrize("offset", [0.0, 1e-9, 1e-4])
@pytest.mark.parametrize("depth", [0.01, 0.8, 30.0])
def test_coalescing_modes_in_a_run_of_joined_wires(offset, depth):
    s, kp, eps = 0.5, 0.9, 2.0
    zc = np.conj((kp**2 - s**2 - 2j * s * kp * (1 + offset)) / eps)
    whole = wire_layer(eps, kp, depth, zc)
    first = replace(whole, thickness=0.4 * depth, wires=(replace(whole.wires[0], ends=(OPEN, JOINED)),))
    second = replace(whole, thickness=0.6 * depth, wires=(replace(whole.wires[0], ends=(JOINED, OPEN)),))
    assert error(stack(first, second), 30.0) < 1e-11


@pytest.mark.parametrize("kp", [1e-9, 1e-4, 1e3, 1e6])
def test_vanishing_and_dense_wires(kp):
    layer = wire_layer(2.25, kp, min(0.9, 800.0 / kp))
    assert error(stack(layer), 60.0) < 1e-11


@pytest.mark.parametrize("depth", [1e-12, 1e-9, 1e-6, 1e-3])
@pytest.mark.parametrize("ends", [(OPEN, OPEN), (GROUNDED, GROUNDED)])
def test_thin_layers(depth, ends):
    layer = wire_layer(2.25, 3.0, depth, ends=ends)
    sample = stack(layer) if ends[0] is OPEN else stack(_film(), layer, _film())
    assert error(sample, 45.0) < 1e-11


@pytest.mark.parametrize("depth", [100.0, 1000.0, 4000.0])
def test_thick_opaque_layers_keep_the_digits_of_the_reflection(depth):
    sample = stack(wire_layer(2.0, 1.3, 0.8), Layer("opaque", medium(-1.0), depth), wire_layer(2.0, 1.3, 0.8))
    assert error(sample, 40.0) < 1e-11
    response = Solver(sample).solve(F, 40.0)
    assert np.all(np.isfinite(response.T))
    assert pytest.approx(np.ones((2, 1, 1)), abs=1e-12) == response.R + response.T


def test_ten_thousand_periods_and_a_metre_of_silver_stay_finite():
    pair = (Layer("high", medium(4.0), 0.7), Layer("low", medium(2.1), 1.0))
    mirror = Solver(stack(*pair * 10_000)).solve([F, 1.03 * F], [0.0, 50.0])
    assert pytest.approx(np.ones((2, 2, 2)), abs=1e-9) == mirror.R + mirror.T
    silver = Solver(stack(Layer("silver", medium(-18.2 + 0.5j), 1.0))).solve(C0 / 632.8e-9, [0.0, 60.0])
    assert pytest.approx(np.ones((2, 1, 2)), abs=1e-12) == silver.R + silver.A
    assert np.all(silver.T == 0.0)
