"""Published and derived values of the geometries beyond wires along z, and full-wave solutions of discrete wires.

"Derived": from one formula by an independent calculation, with the digits given.
"""

import json
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.engine.diffraction import onset
from slabsim.engine.generators import layer_generator
from slabsim.engine.response import Solver
from slabsim.materials.material import VACUUM
from slabsim.stack.directions import tilted
from slabsim.stack.sample import Grid, Layer, Mesh, Plates
from tests.engine.twins import C0, OPEN, medium, stack, wires

DATA = json.loads((Path(__file__).parent.parent / "reference" / "full_wave.json").read_text())
X = (1.0, 0.0, 0.0)
FIVE_PLANES = [case for case in DATA["cases"] if case["case"] == "D1"]
MESHES = [case for case in DATA["cases"] if case["case"] == "M1"]


def powers(sample, frequency, angle=0.0, azimuth=0.0, model="nonlocal"):
    return Solver(sample, model, ("TE", "TM")).solve(frequency, angle, azimuth).T[:2, 0, 0]


@pytest.mark.parametrize(("angle", "T"), [(0.0, 0.212491682), (45.0, 0.112757708)])
def test_wires_in_the_plane_of_incidence(angle, T):
    # derived: kz^2 = kz0^2 - kp^2 and the response of a plasma slab in TE; kp = 138 /m, d = 10 mm, 3 GHz
    edge = 138.0 * C0 / (2 * np.pi)
    sample = stack(Layer("w", VACUUM, 10e-3, wires(10e-3, 0.1e-3, plasma=edge, direction=X)))
    assert_allclose(powers(sample, 3e9, angle)[1], T, atol=1e-9)


def test_wires_in_the_plane_of_incidence_act_as_a_plasma_slab_in_te():
    # derived: |r|, T of TM equal those of TE through eps = 1 - kp^2/k0^2
    edge = 138.0 * C0 / (2 * np.pi)
    flat = stack(Layer("w", VACUUM, 10e-3, wires(10e-3, 0.1e-3, plasma=edge, direction=X)))
    for f, angle in ((3e9, 20.0), (8e9, 70.0)):
        plasma = stack(Layer("p", medium(1.0 - (138.0 * C0 / (2 * np.pi * f)) ** 2), 10e-3))
        assert_allclose(powers(flat, f, angle)[1], powers(plasma, f, angle)[0], rtol=1e-12)


@pytest.mark.parametrize(
    ("ghz", "n", "planes", "slab"),
    [
        (3, 1, 0.235524, 0.211882),
        (3, 3, 0.001830, 0.001643),
        (5, 1, 0.463109, 0.481513),
        (7, 5, 0.652386, 0.603687),
        (8, 5, 0.616955, 0.736869),
    ],
)
def test_planes_of_wires_against_their_homogenised_slab(ghz, n, planes, slab):
    # derived; a = 10 mm, r = 0.1 mm, normal incidence: what homogenisation costs, 4 to 26 % of T
    grid, gap = Grid("g", 10e-3, 0.1e-3, None, X), Layer("gap", VACUUM, 10e-3)
    discrete = stack(*([grid, gap] * n)[:-1])
    assert_allclose(powers(discrete, ghz * 1e9)[1], planes, atol=1e-6)
    whole = stack(Layer("slab", VACUUM, n * 10e-3, wires(10e-3, 0.1e-3, direction=X)))
    assert_allclose(powers(whole, ghz * 1e9)[1], slab, atol=1e-6)


@pytest.mark.parametrize("case", FIVE_PLANES, ids=lambda case: f"k0a={case['k0a']}")
def test_five_planes_of_thick_wires_against_full_wave_solutions(case):
    # r/a = 0.05, normal incidence; below the edge at k0 a = 1.9 the planes are 20 to 30 times better than the slab
    a, f = 1e-2, case["k0a"] * C0 / (2 * np.pi * 1e-2)
    grid, half, gap = Grid("g", a, 0.05 * a, None, X), Layer("half", VACUUM, a / 2), Layer("gap", VACUUM, a)
    planes = stack(half, *([grid, gap] * 5)[:-1], half)
    slab = stack(Layer("slab", VACUUM, 5 * a, wires(a, 0.05 * a, direction=X)))
    errors = []
    for sample in (planes, slab):
        found = Solver(sample, polarizations=("TM",)).solve(f, 0.0, 0.0)
        r, t = -found.r[0, 0, 0], found.t[0, 0, 0]  # r of the electric field
        errors.append(max(abs(r - complex(*case["fullwave_rE"])), abs(t - complex(*case["fullwave_tE"]))))
    if case["k0a"] < 1.95:
        assert errors[0] < 0.011
        assert errors[1] > 0.08
    else:
        assert errors[0] < 0.16
        assert errors[0] < 0.35 * errors[1]


@pytest.mark.parametrize("case", MESHES, ids=lambda case: f"k0a={case['k0a']}")
def test_a_mesh_of_four_periods_against_full_wave_solutions(case):
    # r/a = 0.05, normal incidence, where the mesh is one set of wires along the field; the bound is that of the model
    a, f = 1e-2, case["k0a"] * C0 / (2 * np.pi * 1e-2)
    sample = stack(Layer("mesh", VACUUM, 4 * a, mesh=Mesh(a, 0.05 * a, None, (OPEN, OPEN))))
    found = Solver(sample, polarizations=("TM",)).solve(f, 0.0)
    flat = stack(Layer("w", VACUUM, 4 * a, wires(a, 0.05 * a, direction=X)))
    assert_allclose(found.t, Solver(flat, polarizations=("TM",)).solve(f, 0.0).t[:1], atol=1e-12)
    assert abs(found.t[0, 0, 0] - complex(*case["fullwave_tH"])) < 0.2
    assert abs(found.r[0, 0, 0] - complex(*case["fullwave_rH"])) < 0.25


def test_the_transverse_mode_of_a_mesh_is_that_of_one_set():
    # published form (from memory: Silveirinha and Fernandes 2005): eps_T = eps_h (1 - kp^2/kh^2), kz^2 = kh^2 - kp^2
    a, b = mesh_blocks(s=0.0)
    assert_allclose(a[1, 1] * b[1, 1], 1.0 - (138.0 / 100.0) ** 2, rtol=1e-12)  # -0.9044


def test_the_longitudinal_mode_of_a_mesh():
    # k^2 = l0 (kh^2 - kp^2), from the same form; at normal incidence it is the mode of (psi, V)
    a, b = mesh_blocks(s=0.0)
    assert_allclose(a[2, 2] * b[2, 2], 2.0 * (1.0 - (138.0 / 100.0) ** 2), rtol=1e-12)
    # and at an angle it is isotropic: kz^2 = l0 (kh^2 - kp^2) - kx^2; so is the transverse mode, kh^2 - kp^2 - kx^2
    s = 0.5
    a, b = mesh_blocks(s)
    squares = np.sort(np.linalg.eigvals(a @ b).real)
    transverse, longitudinal = 1.0 - 1.38**2 - s**2, 2.0 * (1.0 - 1.38**2) - s**2
    assert_allclose(squares, np.sort([transverse, transverse, longitudinal]), rtol=1e-12)


def mesh_blocks(s):
    """A and B of a mesh with kp = 138, l0 = 2 at k0 = 100 /m, in vacuum."""
    f = np.array([100.0 * C0 / (2 * np.pi)])
    mesh = Mesh(10e-3, 0.1e-3, None, (OPEN, OPEN), 138.0 * C0 / (2 * np.pi), 2.0)
    found = layer_generator(Layer("m", VACUUM, 1.0, mesh=mesh), False, f, np.ones(1), 0.0, lambda _: None)
    blocks = np.zeros((2, 9), dtype=complex)
    for block, entry, multiplier, values in found.terms:
        blocks[block, entry] += values[0] * (1.0, s, 1.0 - s**2)[multiplier]
    return blocks.reshape(2, 3, 3)


def test_three_sets_that_are_not_joined_along_one_axis():
    # derived from eps_ii = eps_h (1 - kp^2/(kh^2 - k_i^2)): along an axis both branches have k^2 = kh^2 - kp^2
    f = np.array([100.0 * C0 / (2 * np.pi)])
    edge = 138.0 * C0 / (2 * np.pi)
    sets = tuple(wires(10e-3, 0.1e-3, plasma=edge, direction=n)[0] for n in (X, (0.0, 1.0, 0.0), (0.0, 0.0, 1.0)))
    found = layer_generator(Layer("m", VACUUM, 1.0, sets), False, f, np.ones(1), 0.0, lambda _: None)
    blocks = np.zeros((2, 9), dtype=complex)
    for block, entry, multiplier, values in found.terms:
        factor = 1.0 if multiplier == 3 else (1.0, 0.0, 1.0)[multiplier]  # normal incidence: the resonance is 1/1
        blocks[block, entry] += values[0] * factor
    a, b = blocks.reshape(2, 3, 3)
    assert_allclose(np.linalg.eigvals(a @ b), 1.0 - 1.38**2, rtol=1e-12)


def test_crossed_grids_are_blind_to_the_azimuth_at_normal_incidence():
    crossed = stack(Grid("a", 4e-3, 0.1e-3, None, X), Grid("b", 4e-3, 0.1e-3, None, (0.0, 1.0, 0.0)))
    T = [Solver(crossed).solve(10e9, 0.0, azimuth).T[:2, 0, 0] for azimuth in (0.0, 17.0, 45.0)]
    assert_allclose(T, T[0][0], rtol=1e-12)


def test_a_grid_at_45_degrees_sends_half_of_the_field_across():
    # common practice: an ideal polarizer at 45 degrees halves the field twice, T_co = T_cross = 1/4
    dense = stack(Grid("g", 0.2e-3, 0.05e-3, None, tilted(90.0, 45.0)))
    found = Solver(dense).solve(1e9, 0.0)
    assert_allclose(found.T[:, 0, 0], 0.25, atol=1e-3)


def test_plates_pass_the_field_across_them_and_cut_off_the_field_along():
    # common practice: cut-off c/(2 b); far below it a honeycomb vent of depth d attenuates by 27.3 d/b dB
    plates = Plates("p", 12e-3, 4e-3, "y", VACUUM)
    f = np.array([5e9, 10e9])
    found = Solver(stack(plates)).solve(f, 0.0, 0.0)
    assert_allclose(found.T[0, :, 0], 1.0, atol=1e-13)  # TE: E along y, across the plates
    edge = C0 / (2 * 4e-3)
    decay = 27.2875 * 12e-3 / 4e-3 * np.sqrt(1.0 - (f / edge) ** 2)
    loss = -10 * np.log10(found.T[1, :, 0])
    longer = -10 * np.log10(Solver(stack(Plates("p", 24e-3, 4e-3, "y", VACUUM))).solve(f, 0.0, 0.0).T[1, :, 0])
    assert_allclose(longer - loss, decay, rtol=1e-6)


def test_the_edge_of_plates_reflects_as_carlson_and_heins_found():
    # Q. Appl. Math. 4, 313 (1947): |r| = |kz0 - kappa|/(kz0 + kappa); a deep lossy filling shows the front edge alone
    filled = medium(1.0 + 2e-4j)
    thick = stack(Plates("p", 20.0, 4e-3, "y", filled), front=VACUUM, back=VACUUM)
    f = 50e9
    for angle in (0.0, 20.0):
        k = 2 * np.pi * f / C0
        kz, kappa = k * np.cos(np.deg2rad(angle)), np.sqrt(k**2 - (np.pi / 4e-3) ** 2)
        R = Solver(thick).solve(f, angle, 90.0).R[0, 0, 0]
        assert_allclose(R, ((kz - kappa) / (kz + kappa)) ** 2, rtol=2e-3)


def test_points_beyond_the_onset_of_diffraction_have_no_value():
    sample = stack(Grid("g", 10e-3, 0.1e-3, None, X))
    angles = np.array([0.0, 30.0])
    # grating equation: along the wires nothing changes, across them f = c/(a (1 + sin))
    assert_allclose(onset(sample, angles, 90.0), C0 / 10e-3 / np.array([1.0, 1.5]), rtol=1e-12)
    assert_allclose(onset(sample, angles, 0.0), C0 / 10e-3 / np.array([1.0, np.cos(np.pi / 6)]), rtol=1e-12)
    for azimuth in (0.0, 90.0):
        edge = onset(sample, angles, azimuth)[1]
        found = Solver(sample).solve(edge * np.array([1 - 1e-9, 1 + 1e-9]), 30.0, azimuth)
        assert np.all(np.isfinite(found.T[:, 0]))
        assert np.all(np.isnan(found.T[:, 1]))
        assert np.all(np.isnan(found.A[:, 1]))
    assert np.all(np.isinf(onset(stack(Layer("a", VACUUM, 1.0)), angles)))


def test_beyond_its_second_mode_a_set_of_plates_has_no_tm_response_but_a_te_one():
    sample = stack(Plates("p", 12e-3, 4e-3, "y", VACUUM))
    found = Solver(sample).solve(40e9, 30.0, 90.0)  # c/(2 b) = 37.5 GHz
    assert np.isfinite(found.T[0, 0, 0])
    assert np.isnan(found.T[1, 0, 0])
    assert np.isnan(found.A[1, 0, 0])


@pytest.mark.parametrize(
    ("eps", "mu", "n"),
    [
        (-3.0, -0.555555556, -1.290994449),
        (-3.0, -0.536585366 + 0.170731707j, -1.284335162 + 0.199400880j),
        (-3.0, 0.2 + 0.5j, -0.712583133 + 1.052508775j),
    ],
)
def test_negative_index(eps, mu, n):
    # derived: n = sqrt(eps) sqrt(mu) with the branch that decays or carries power away
    thickness, f = 1e-3, 5e9
    sample = stack(Layer("n", medium(eps, mu), thickness), front=VACUUM, back=VACUUM)
    k0 = 2 * np.pi * f / C0
    z = mu / n  # wave impedance
    phase = np.exp(1j * n * k0 * thickness)
    rho = (z - 1) / (z + 1)
    expected = (1 - rho**2) * phase / (1 - (rho * phase) ** 2)  # Airy, textbook
    for solver in (Solver(sample), ports_solver(sample)):
        assert_allclose(solver.solve(f, 0.0).t[:2, 0, 0], expected, rtol=1e-7)


def test_a_half_space_of_negative_index():
    # derived: R = 0.158624783 at eps = -3, mu = -5/9
    sample = stack(back=medium(-3.0, -5.0 / 9.0))
    assert_allclose(Solver(sample).solve(5e9, 0.0).R[:, 0, 0], 0.158624783, atol=1e-9)


def test_a_slab_of_minus_one_turns_the_phase_back():
    # textbook: eps = mu = -1 reflects nothing at any angle, t = exp(-i kz d)
    sample = stack(Layer("n", medium(-1.0, -1.0), 0.1))
    for angle in (0.0, 30.0, 75.0):
        found = ports_solver(sample).solve(1e9, angle, 20.0)
        phase = -2 * np.pi * 1e9 / C0 * 0.1 * np.cos(np.deg2rad(angle))
        assert_allclose(found.r, 0.0, atol=1e-12)
        assert_allclose(found.t[:2, 0, 0], np.exp(1j * phase), atol=1e-11)


def test_the_host_inductance_scales_the_plasma_edge_of_wires_along_the_field():
    # derived: eps along the wires is eps_h - kp^2/(k0^2 mu) with inductance = "host", zero at k0^2 = kp^2/(eps_h mu)
    edge = 138.0 * C0 / (2 * np.pi)
    for inductance, mu_eff in (("vacuum", 1.0), ("host", 2.0)):
        one = wires(10e-3, 0.1e-3, plasma=edge, direction=X, inductance=inductance)
        host = medium(1.0 + 0j, 2.0)
        sample = stack(Layer("w", host, 5e-3, one))
        f = 10e9
        eps = 1.0 - (edge / f) ** 2 / mu_eff
        plain = stack(Layer("p", medium(eps, 2.0), 5e-3))
        assert_allclose(powers(sample, f)[1], powers(plain, f)[1], rtol=1e-11)


def ports_solver(sample):
    solver = Solver(sample, polarizations=("TE", "TM"))
    solver.is_scalar = False
    return solver


def test_the_onset_of_wires_in_the_plane_of_incidence_survives_rounding():
    # at 8, 12 and 82 deg cos^2 + sin^2 exceeds 1 in the last digit
    for azimuth in (8.0, 12.0, 82.0):
        grid = stack(Grid("g", 10e-3, 0.1e-3, None, tilted(90.0, azimuth)))
        assert_allclose(onset(grid, [30.0], azimuth), C0 / 10e-3 / np.cos(np.pi / 6), rtol=1e-9)
