"""What must hold for every geometry of wires, whatever the numbers."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.engine.fields import absorbed_by_element, losses
from slabsim.engine.response import Solver
from slabsim.errors import InputError
from slabsim.materials.dispersion import Constant
from slabsim.materials.material import VACUUM, Material
from slabsim.stack.directions import tilted
from slabsim.stack.sample import Film, Grid, Layer, Mesh, Patches, Plates, SeriesLoad, Strips, WireEnd
from tests.engine.mixed_twins import axes_medium, random_mixed_stack
from tests.engine.twins import GROUNDED, JOINED, OPEN, medium, random_stack, stack, wires

SEEDS = range(0, 300, 3)
COPPER = Material("copper", Constant(1.0, 0.0, 5.8e5))
F, ANGLES = np.linspace(2e9, 20e9, 9), [0.0, 1e-6, 20.0, 45.0, 80.0, 89.99]


def through_ports(sample, model="nonlocal"):
    """A solver that takes the four-port engine, whatever the stack."""
    solver = Solver(sample, model, ("TE", "TM"))
    solver.is_scalar = False
    return solver


def from_behind(sample):
    """The stack seen from behind, after half a turn about an axis in its plane, x: y and z change sign."""

    def flipped(n):
        x, y, z = n[0], -n[1], -n[2]
        return (x, y, z) if z > 0 or n[2] == 0 else (-x, -y, -z)

    elements = []
    for element in reversed(sample.elements):
        if isinstance(element, Layer):
            sets = tuple(replace(w, ends=w.ends[::-1], direction=flipped(w.direction)) for w in element.wires)
            mesh = element.mesh and replace(element.mesh, ends=element.mesh.ends[::-1])
            element = replace(element, wires=sets, mesh=mesh, rotation=-element.rotation)
        elif isinstance(element, Grid):
            element = replace(element, direction=flipped(element.direction))
        elements.append(element)
    return replace(sample, front=sample.back, back=sample.front, elements=tuple(elements))


def test_lossless_stacks_conserve_power_over_all_channels():
    gaps = []
    for seed in range(0, 600, 3):
        sample, f, angle, azimuth = random_mixed_stack(np.random.default_rng(seed), lossless=True)
        gaps.append(np.max(abs(Solver(sample).solve(f, angle, azimuth).A)))
    # the one above 1e-12 is a narrow cavity between a grid and strips, where rounding grows with the field
    assert sum(gap > 1e-12 for gap in gaps) <= 1
    assert max(gaps) < 1e-11


def test_passive_stacks_absorb_no_less_than_nothing():
    for seed in range(1, 300, 2):
        sample, f, angle, azimuth = random_mixed_stack(np.random.default_rng(seed))
        assert np.all(Solver(sample).solve(f, angle, azimuth).A > -1e-12)


def test_jones_matrices_are_reciprocal():
    # A wave with kt at azimuth phi comes back along itself with -kt from behind. Seen after half a turn about x, the
    # azimuth is 180 - phi; E.s keeps its size for TE and h.s for TM, so that the cross terms trade places up to a sign.
    for seed in SEEDS:
        sample, f, angle, azimuth = random_mixed_stack(np.random.default_rng(seed), lossless=seed % 2 == 0)
        sample = replace(sample, front=medium(1.7), back=medium(1.7))
        here = through_ports(sample).solve(f, angle, azimuth)
        there = through_ports(from_behind(sample)).solve(f, angle, 180.0 - azimuth)
        if not sample.mixes_polarizations:
            assert_allclose(there.t, here.t, rtol=1e-9, atol=1e-12)
            continue
        assert_allclose(there.t[:2], here.t[:2], rtol=1e-9, atol=1e-12)
        assert_allclose(abs(there.t[[3, 2]]), abs(here.t[2:]), rtol=1e-9, atol=1e-12)
        signs = [there.t[3, 0, 0] * np.conj(here.t[2, 0, 0]), there.t[2, 0, 0] * np.conj(here.t[3, 0, 0])]
        assert all(abs(sign.imag) < 1e-9 * abs(sign) + 1e-12 for sign in signs)


def test_a_sample_turned_with_the_plane_of_incidence_looks_the_same():
    for seed in SEEDS:
        sample, f, angle, azimuth = random_mixed_stack(np.random.default_rng(seed))
        turn = np.random.default_rng(seed).uniform(-180, 180)
        elements = []
        for element in sample.elements:
            if isinstance(element, Layer):
                element = replace(element, rotation=element.rotation + np.deg2rad(turn))
            elif isinstance(element, Grid):
                x, y = element.direction[:2]
                element = replace(element, direction=tilted(90.0, np.rad2deg(np.arctan2(y, x)) + turn))
            elements.append(element)
        here = Solver(sample).solve(f, angle, azimuth)
        there = Solver(replace(sample, elements=tuple(elements))).solve(f, angle, azimuth + turn)
        assert_allclose(there.r, here.r, atol=1e-10)
        if here.t is not None:
            assert_allclose(there.t, here.t, atol=1e-10)


def test_both_engines_agree_where_both_apply():
    for seed in range(150):
        sample, f, angle = random_stack(np.random.default_rng(seed), lossless=seed % 3 == 0)
        for model in ("nonlocal", "local"):
            scalar = Solver(sample, model).solve(f, angle)
            ports = through_ports(sample, model).solve(f, angle, 77.0)
            assert_allclose(ports.r, scalar.r, atol=1e-10)
            if scalar.t is not None:
                assert_allclose(ports.t, scalar.t, rtol=1e-9, atol=1e-11)


def test_deep_decay_keeps_its_relative_digits():
    # 0.6 m of a lossy host: |t| between 1e-95 and 1e-103, the same in both engines
    sample = stack(Layer("deep", medium(2.25 + 3.0j), 0.6, wires(10e-3, 0.5e-3)))
    scalar, ports = Solver(sample).solve(20e9, [0.0, 50.0]), through_ports(sample).solve(20e9, [0.0, 50.0])
    assert np.all((abs(scalar.t) < 1e-60) & (abs(scalar.t) > 0.0))
    assert_allclose(ports.t[0], scalar.t[0], rtol=1e-9)


@pytest.mark.parametrize("axis", ["x", "y"])
def test_wires_at_a_small_tilt_tend_to_normal_ones(axis):
    azimuth = {"x": 0.0, "y": 90.0}[axis]
    normal = Solver(stack(Layer("w", medium(2.25), 20e-3, wires(5e-3, 0.2e-3)))).solve(F, ANGLES)
    gaps = []
    for tilt in (1e-2, 1e-4):
        tilted_wires = wires(5e-3, 0.2e-3, direction=tilted(tilt, azimuth))
        found = Solver(stack(Layer("w", medium(2.25), 20e-3, tilted_wires))).solve(F, ANGLES, 33.0)
        gaps.append(np.max(abs(found.t[:2] - normal.t)))
        assert np.max(abs(found.t[2:])) < 1e-2
    assert gaps[1] < 1e-4


def test_wires_at_a_tilt_of_nearly_90_degrees_tend_to_flat_ones():
    # long wires that end: the ends count less and less; at 89.9 deg they are 570 thicknesses long
    lossy = Material("metal", Constant(1.0, 0.0, 1e4))  # the current dies out before it meets the other end
    flat = Solver(stack(Layer("w", medium(1.0), 20e-3, wires(5e-3, 0.2e-3, lossy, direction=(1.0, 0.0, 0.0)))))
    steep = wires(5e-3, 0.2e-3, lossy, direction=tilted(89.9, 0.0))
    found = Solver(stack(Layer("w", medium(1.0), 20e-3, steep))).solve(F, ANGLES[:5], 90.0)
    assert_allclose(found.t[:2], flat.solve(F, ANGLES[:5], 90.0).t[:2], atol=0.02)


def test_cutting_a_layer_into_joined_pieces_changes_nothing():
    direction = tilted(35.0, 20.0)
    host = axes_medium((2.0, 2.5, 3.0 + 0.1j))
    whole = Layer(
        "w", host, 20e-3, (*wires(5e-3, 0.2e-3, COPPER, direction=direction), *wires(4e-3, 0.1e-3)), rotation=0.3
    )

    def piece(front, back):
        sets = tuple(replace(one, ends=(front, back)) for one in whole.wires)
        return replace(whole, thickness=whole.thickness / 2, wires=sets)

    one = Solver(stack(whole)).solve(F, ANGLES, 50.0)
    two = Solver(stack(piece(OPEN, JOINED), piece(JOINED, OPEN))).solve(F, ANGLES, 50.0)
    assert_allclose(two.t, one.t, atol=1e-11)
    assert_allclose(two.r, one.r, atol=1e-11)


def test_sets_in_another_order_give_the_same_numbers():
    sets = (
        *wires(5e-3, 0.2e-3, direction=tilted(30.0, 10.0)),
        *wires(6e-3, 0.1e-3),
        *wires(4e-3, 0.1e-3, direction=(1.0, 0.0, 0.0)),
    )
    numbers = [
        Solver(stack(Layer("w", medium(2.0), 9e-3, order))).solve(F, ANGLES, 70.0).t for order in (sets, sets[::-1])
    ]
    assert_allclose(numbers[0], numbers[1], atol=1e-11)


def test_in_plane_wires_across_the_plane_of_incidence_need_no_nonlocal_model():
    sample = stack(Layer("w", medium(2.0), 9e-3, wires(4e-3, 0.1e-3, direction=(0.0, 1.0, 0.0))))
    models = [Solver(sample, model).solve(F, ANGLES, 0.0).t for model in ("nonlocal", "local")]
    assert_allclose(models[0], models[1], atol=1e-12)


def test_metal_takes_what_a_layer_absorbs_in_a_lossless_host():
    sets = (
        *wires(5e-3, 0.2e-3, COPPER, direction=tilted(30.0, 10.0)),
        *wires(4e-3, 0.1e-3, COPPER, direction=(1.0, 0.0, 0.0)),
    )
    mesh = Mesh(3e-3, 0.1e-3, COPPER, (OPEN, GROUNDED))
    sample = stack(
        Layer("sets", medium(2.0), 9e-3, sets), Layer("mesh", medium(1.5), 5e-3, mesh=mesh), Patches("p", 3e-3, 0.5e-3)
    )
    for model in ("nonlocal", "local"):
        found = losses(sample, 12e9, 40.0, 25.0, model)
        assert [(one.element, one.part) for one in found] == [
            (0, ""), (0, "wires 1"), (0, "wires 2"), (1, ""), (1, "mesh"), (2, ""),
        ]  # fmt: skip
        shares = np.array([one.shares for one in found])
        assert_allclose(shares[1] + shares[2], shares[0], atol=1e-11)
        assert_allclose(shares[4], shares[3], atol=1e-11)
        assert np.all(shares[[1, 2, 4]] > 1e-6)
        total = shares[0] + shares[3] + shares[5]
        assert_allclose(total, Solver(sample, model).solve(12e9, 40.0, 25.0).A[:, 0, 0], atol=1e-12)


def test_a_lossy_host_and_loads_take_the_rest():
    held = WireEnd("grounded", SeriesLoad(50.0))
    sample = stack(
        Strips("s", 3e-3, 0.3e-3),
        Layer("gap", medium(1.0), 2e-3),
        Layer("w", medium(2.0 + 0.05j), 9e-3, wires(4e-3, 0.1e-3, COPPER, back=held)),
        Film("f", 100.0),
    )
    strips, _, layer, metal, film = losses(sample, 12e9, 40.0)
    assert np.all(np.array(layer.shares) > np.array(metal.shares))
    assert np.all(np.array(film.shares) > 1e-3)
    assert_allclose(strips.shares, 0.0, atol=1e-13)


def test_losses_of_many_angles_come_in_one_array():
    sample = stack(Layer("w", medium(2.0 + 0.05j), 9e-3, wires(4e-3, 0.1e-3, COPPER, direction=(1.0, 0.0, 0.0))))
    angles = np.linspace(0, 80, 21)
    absorbed = absorbed_by_element(sample, 12e9, angles, "TM", azimuth_deg=30.0)
    assert absorbed.shape == (1, 21)
    assert_allclose(absorbed[0], Solver(sample).solve(12e9, angles, 30.0).A[1, 0], atol=1e-13)


@pytest.mark.parametrize(("n_freqs", "n_angles"), [(1, 1), (1, 9), (9, 1), (7, 8), (17, 3), (3, 17)])
def test_every_shape_of_grid_gives_the_numbers_of_its_points(n_freqs, n_angles):
    sample = stack(
        Grid("g", 4e-3, 0.1e-3, None, (1.0, 0.0, 0.0)),
        Layer("w", medium(2.0 + 0.05j), 9e-3, wires(4e-3, 0.1e-3, COPPER, direction=tilted(30.0, 10.0))),
        Plates("p", 6e-3, 4e-3, "y", VACUUM),
    )
    f, angles = np.linspace(5e9, 20e9, n_freqs), np.linspace(0, 80, n_angles)
    response = Solver(sample).solve(f, angles, 90.0)
    for i, j in ((0, 0), (-1, -1), (n_freqs // 2, n_angles // 3)):
        point = Solver(sample).solve(f[i], angles[j], 90.0)
        assert_allclose(response.t[:, i, j], point.t[:, 0, 0], atol=1e-14)
        assert_allclose(response.R[:, i, j], point.R[:, 0, 0], atol=1e-14)


def test_plates_are_refused_at_a_slant():
    with pytest.raises(InputError, match=r"azimuth = 30 deg with plates normal to y: .* use a multiple of 90 deg"):
        Solver(stack(Plates("p", 6e-3, 4e-3, "y", VACUUM))).solve(1e10, 10.0, 30.0)


def test_an_azimuth_that_is_no_number_is_refused():
    with pytest.raises(InputError, match="azimuth_deg = nan; it must be a finite number"):
        Solver(stack()).solve(1e10, 10.0, np.nan)
