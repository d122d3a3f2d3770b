"""Reciprocity and power balance of the reference solver, and what it refuses."""

import math
from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from tests.reference.dense import Grounded, HalfSpace, Joined, Sheet, Slab, WireArray, solve

AIR = HalfSpace()


def reverse(stack):
    """The stack seen from behind."""
    return [
        replace(item, wires=replace(item.wires, front=item.wires.back, back=item.wires.front))
        if isinstance(item, Slab) and item.wires
        else item
        for item in reversed(stack)
    ]


def random_lossless_stack(rng):
    """Four layers: open, joined, loaded and grounded wires, a magnetic host, sheets."""
    eps, kp, d = rng.uniform(1, 8, 4), rng.uniform(50, 400, 4), rng.uniform(0.002, 0.03, 4)
    x, y = 1j * rng.uniform(-1e-3, 1e-3, 3), 1j * rng.uniform(-3, 3, 4)
    return [
        Sheet(y[0], y[1]),
        Slab(eps[0], 1, d[0], WireArray(kp[0], back=Joined(x[0]))),
        Slab(eps[1], 1.3, d[1], WireArray(kp[1], 1e-3j, front=Joined(x[1]), back=Grounded(x[2]))),
        Sheet(y[2], y[3]),
        Slab(-eps[2], 1, d[2] / 10),
        Slab(eps[3], 1, d[3], WireArray(kp[3], front=Grounded())),
    ]


def random_lossy_stack(rng):
    stack, loss = random_lossless_stack(rng), rng.uniform(0, 0.3, 6)
    lossy = [
        replace(item, eps=item.eps + 1j * x) if isinstance(item, Slab) else Sheet(item.y_te + x, item.y_tm + 2 * x)
        for item, x in zip(stack, loss, strict=True)
    ]
    wires = replace(lossy[2].wires, zeta=2e-3 + 1e-3j, front=Joined(2e-4), back=Grounded(1e-3 + 1e-4j))
    lossy[2] = replace(lossy[2], wires=wires)
    return lossy


@pytest.mark.parametrize("polarization", ["TE", "TM"])
def test_lossless_stacks_obey_stokes_relations(polarization):
    rng = np.random.default_rng(11)
    for _ in range(4):
        stack, k0, theta = random_lossless_stack(rng), rng.uniform(20, 150), rng.uniform(0.1, 1.5)
        forward = solve(AIR, stack, AIR, k0, theta, polarization)
        backward = solve(AIR, reverse(stack), AIR, k0, theta, polarization)
        assert abs(forward.A) < 1e-30
        assert_allclose(forward.t, backward.t, rtol=1e-14)
        assert abs(forward.r * forward.t.conjugate() + backward.r.conjugate() * forward.t) < 1e-14
        assert np.all(np.abs(forward.absorbed) < 1e-30)


@pytest.mark.parametrize("model", ["nonlocal", "local"])
@pytest.mark.parametrize("polarization", ["TE", "TM"])
def test_lossy_stacks_are_reciprocal_and_account_for_their_losses(polarization, model):
    rng = np.random.default_rng(12)
    for _ in range(4):
        stack, k0, theta = random_lossy_stack(rng), rng.uniform(20, 150), rng.uniform(0.1, 1.0)
        glass = HalfSpace(2.25, 1)
        behind = math.asin(math.sin(theta) / 1.5)
        forward = solve(AIR, stack, glass, k0, theta, polarization, model)
        backward = solve(glass, reverse(stack), AIR, k0, behind, polarization, model)
        # t of E amplitudes times n cos(theta) of the side it goes to; `behind` is rounded to double
        assert_allclose(forward.t * 1.5 * math.cos(behind), backward.t * math.cos(theta), rtol=1e-12)
        assert_allclose(forward.T, backward.T, rtol=1e-12)
        assert min(forward.absorbed) >= 0
        assert_allclose(sum(forward.absorbed) + np.sum(forward.end_loads), forward.A, rtol=1e-13)


def test_more_digits_change_nothing():
    rng = np.random.default_rng(5)
    for _ in range(3):
        stack = random_lossy_stack(rng)
        usual, more = (solve(AIR, stack, HalfSpace(2 + 0.1j, 1), 70.0, 1.2, "TM", digits=n) for n in (30, 70))
        assert_allclose([usual.r, usual.t], [more.r, more.t], rtol=1e-15)
        assert_allclose(usual.absorbed, more.absorbed, rtol=1e-14, atol=1e-40)


def test_power_is_continuous_between_elements():
    stack = [item for item in random_lossy_stack(np.random.default_rng(13)) if isinstance(item, Slab)]
    stack[1] = replace(stack[1], wires=replace(stack[1].wires, front=Joined(), back=Grounded()))
    stack[0] = replace(stack[0], wires=replace(stack[0].wires, back=Joined()))
    response = solve(AIR, stack, AIR, 60.0, 1.0, "TM")
    assert_allclose(response.flux_before[0], 1 - response.R, rtol=1e-14)
    assert_allclose(response.flux_before[1:], response.flux_after[:-1], rtol=1e-14)
    assert_allclose(response.flux_after[-1], response.T, rtol=1e-14)


def test_normal_incidence_tm_and_te_differ_by_the_sign_of_r():
    stack = [Slab(2.1 + 0.1j, 1.3, 0.01), Sheet(0.3, 0.3), Slab(4, 1, 0.02, WireArray(138))]
    te, tm = (solve(HalfSpace(1.5, 1.1), stack, HalfSpace(3, 2), 80.0, 0, p) for p in ("TE", "TM"))
    assert_allclose([tm.r, tm.t], [-te.r, te.t], rtol=1e-14)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"polarization": "tm"}, "it must be 'TE' or 'TM'"),
        ({"model": "drude"}, "it must be 'nonlocal' or 'local'"),
        ({"back": "PEC"}, "it must be a HalfSpace or 'perfect conductor'"),
        ({"front": HalfSpace(2 + 0.1j, 1)}, "eps and mu must be real and positive"),
        ({"elements": [Slab(1, 1, 0.1, WireArray(9, back=Joined()))]}, "meets no joined wire end"),
    ],
)
def test_refuses_what_it_cannot_solve(change, message):
    usual = {"front": AIR, "elements": [], "back": AIR, "k0": 1, "theta": 0, "polarization": "TM"}
    with pytest.raises(ValueError, match=message):
        solve(**(usual | change))
