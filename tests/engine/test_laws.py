"""What must hold for every stack, whatever the numbers."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.engine.response import Solver
from slabsim.stack.sample import Group, Layer, WireSet
from tests.engine.twins import JOINED, OPEN, medium, random_stack, stack, wires

SEEDS = range(0, 360, 3)


def turned(sample):
    """The stack seen from behind."""
    elements = []
    for element in reversed(sample.elements):
        if isinstance(element, Layer):
            element = replace(element, wires=tuple(replace(one, ends=one.ends[::-1]) for one in element.wires))
        elements.append(element)
    return replace(sample, front=sample.back, back=sample.front, elements=tuple(elements))


def test_lossless_stacks_conserve_power():
    worst = 0.0
    for seed in SEEDS:
        sample, frequency, angle_deg = random_stack(np.random.default_rng(seed), lossless=True)
        worst = max(worst, np.max(abs(Solver(sample).solve(frequency, angle_deg).A)))
    assert worst < 1e-12


def test_passive_stacks_absorb_no_less_than_nothing():
    for seed in range(1, 400, 2):
        sample, frequency, angle_deg = random_stack(np.random.default_rng(seed))
        assert np.all(Solver(sample).solve(frequency, angle_deg).A > -1e-12)


def test_transmission_is_reciprocal():
    # equal lossless half-spaces: t is the same from both sides, and so is |r| without loss
    for seed in SEEDS:
        sample, frequency, angle_deg = random_stack(np.random.default_rng(seed), lossless=seed % 2 == 0)
        sample = replace(sample, front=medium(1.7), back=medium(1.7))
        here, there = Solver(sample).solve(frequency, angle_deg), Solver(turned(sample)).solve(frequency, angle_deg)
        assert_allclose(there.t, here.t, rtol=1e-9, atol=1e-12)
        if seed % 2 == 0:
            assert_allclose(there.R, here.R, atol=1e-10)


def test_stokes_relation_of_lossless_stacks():
    # r_front t* + r_back* t = 0 (textbook)
    for seed in SEEDS:
        sample, frequency, angle_deg = random_stack(np.random.default_rng(seed), lossless=True)
        sample = replace(sample, front=medium(1.7), back=medium(1.7))
        here, there = Solver(sample).solve(frequency, angle_deg), Solver(turned(sample)).solve(frequency, angle_deg)
        assert np.max(abs(here.r * np.conj(here.t) + np.conj(there.r) * here.t)) < 1e-10


@pytest.mark.parametrize("n_pieces", [2, 3, 5])
def test_cutting_a_wire_layer_into_joined_pieces_changes_nothing(n_pieces):
    rng = np.random.default_rng(n_pieces)
    whole = Layer("wires", medium(2.25 + 0.01j), 50e-3, wires(10e-3, 0.5e-3))
    parts = rng.dirichlet(np.ones(n_pieces)) * whole.thickness
    pieces = [
        replace(
            whole,
            thickness=float(part),
            wires=(replace(whole.wires[0], ends=(OPEN if i == 0 else JOINED, OPEN if i == n_pieces - 1 else JOINED)),),
        )
        for i, part in enumerate(parts)
    ]
    f, angles = np.linspace(0.5e9, 12e9, 70), [0.0, 20.0, 60.0, 89.0]
    one, cut = Solver(stack(whole)).solve(f, angles), Solver(stack(*pieces)).solve(f, angles)
    assert_allclose(cut.r, one.r, atol=1e-12)
    assert_allclose(cut.t, one.t, atol=1e-12)


def test_vanishing_wires_leave_the_host():
    f, angles = np.linspace(1e9, 10e9, 11), [0.0, 30.0, 80.0]
    faint = WireSet((10e-3, 10e-3), 0.1e-3, None, (OPEN, OPEN), 10.0)  # a plasma frequency of 10 Hz
    with_wires = Solver(stack(Layer("a", medium(2.0), 20e-3, (faint,)))).solve(f, angles)
    host = Solver(stack(Layer("a", medium(2.0), 20e-3))).solve(f, angles)
    assert_allclose(with_wires.r, host.r, atol=1e-12)
    assert_allclose(with_wires.t, host.t, atol=1e-12)


def test_te_and_normal_incidence_do_not_see_wires():
    f, angles = np.linspace(1e9, 10e9, 11), [0.0, 30.0, 80.0]
    layer = Layer("a", medium(2.0), 20e-3, wires(10e-3, 0.5e-3))
    seen, host = Solver(stack(layer)).solve(f, angles), Solver(stack(replace(layer, wires=()))).solve(f, angles)
    assert_allclose(seen.t[0], host.t[0], atol=1e-13)
    assert_allclose(seen.t[1, :, 0], host.t[1, :, 0], atol=1e-12)
    assert_allclose(seen.r[1, :, 0], -seen.r[0, :, 0], atol=1e-12)


def test_dense_wires_at_their_tem_resonance_pass_every_angle():
    # T -> 1 as 1/kp^2 (derived in closed form: T - 1 = -2.2e-5 at kp = 1e4 /m, 60 deg, d = 100 mm)
    c = 299_792_458
    dense = WireSet((10e-3, 10e-3), 0.1e-3, None, (OPEN, OPEN), 1e4 * c / (2 * np.pi))
    T = Solver(stack(Layer("a", medium(1.0), 0.1, (dense,)))).solve(c / 0.2, [60.0]).T[1, 0, 0]
    assert pytest.approx(-2.22057e-5, rel=1e-4) == T - 1


def test_a_group_equals_its_layers_written_out():
    pair = (Layer("a", medium(2.0), 3e-3), Layer("b", medium(4.0 + 0.1j), 2e-3, wires(2e-3, 0.1e-3)))
    f = np.linspace(5e9, 20e9, 9)
    grouped = Solver(stack(Group(3, (Group(2, pair),)))).solve(f, [0.0, 50.0])
    written = Solver(stack(*pair * 6)).solve(f, [0.0, 50.0])
    assert np.array_equal(grouped.t, written.t)


def test_the_host_of_the_front_only_shifts_the_phase():
    f, angle = 10e9, 40.0
    plate = Layer("plate", medium(3.0), 4e-3)
    bare, shifted = (
        Solver(stack(plate)).solve(f, angle),
        Solver(stack(Layer("air", medium(1.0), 7e-3), plate)).solve(f, angle),
    )
    phase = np.exp(2j * np.pi * f / 299_792_458 * 7e-3 * np.cos(np.deg2rad(angle)))
    assert_allclose(shifted.t, bare.t * phase, atol=1e-14)
    assert_allclose(shifted.r, bare.r * phase**2, atol=1e-14)
