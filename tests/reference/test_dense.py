"""Slabs of wires in the reference solver, against closed forms and tabulated values in exp(-i w t)."""

import cmath
import math
from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from tests.reference import lattice, sheets
from tests.reference.closed_forms import open_slab
from tests.reference.dense import Grounded, HalfSpace, Joined, Open, Slab, WireArray, solve

AIR = HalfSpace()
PEC = "perfect conductor"


def k0_of(frequency):
    return 2 * math.pi * frequency / 299_792_458.0


def free_slab(k0, theta_deg, kp, thickness, eps=1, model="nonlocal", **wires):
    slab = Slab(eps, 1, thickness, WireArray(kp, **wires))
    return solve(AIR, [slab], AIR, k0, math.radians(theta_deg), "TM", model)


def test_open_wires_reproduce_the_value_of_the_closed_form():
    # a = 10 mm, r = 0.5 mm, lattice constant rounded to 0.5275 (derived here, even and odd parts)
    kp = math.sqrt(2 * math.pi / 1e-4 / (math.log(10 / math.pi) + 0.5275))
    response = solve(AIR, [Slab(2.25, 1, 0.05, WireArray(kp))], AIR, k0_of(3.7e9), 1.0, "TM")
    assert_allclose(response.r, -0.117914187846 - 0.158694282017j, rtol=0, atol=1e-12)
    assert_allclose(response.t, 0.78683468605 - 0.584639671924j, rtol=0, atol=1e-11)


@pytest.mark.parametrize("is_lossy", [False, True])
def test_open_wires_follow_the_closed_form(is_lossy):
    rng = np.random.default_rng(3)
    for _ in range(25):
        theta, kp, eps = rng.uniform(0.05, 1.5), 10 ** rng.uniform(0.5, 4), rng.uniform(1, 12)
        k0, thickness = 10 ** rng.uniform(0, 2.5), 10 ** rng.uniform(-3.5, -0.7)
        mu, zeta = 1, 0
        if is_lossy:
            eps, zeta = eps + 1j * rng.uniform(0, 2), 10 ** rng.uniform(-6, 0) * (1 - 0.7j)
            mu = rng.uniform(-2, 3) + 0.2j
        response = solve(AIR, [Slab(eps, mu, thickness, WireArray(kp, zeta))], AIR, k0, theta, "TM")
        r, t = open_slab(k0, theta, kp, thickness, eps, mu, zeta)
        assert_allclose([response.r, response.t], [r, t], rtol=1e-14)


def test_decay_of_exp_minus_4000_loses_no_digits():
    kp, thickness = 1e5, 0.04
    response = solve(AIR, [Slab(2.25, 1, thickness, WireArray(kp))], AIR, 60.0, 0.9, "TM")
    r, t = open_slab(60.0, 0.9, kp, thickness, 2.25)
    assert_allclose([response.r, response.t], [r, t], rtol=1e-15)
    assert abs(response.A) < 1e-30


def test_tiny_transmission_keeps_its_digits():
    response = solve(AIR, [Slab(4 + 3j, 1, 9.0, WireArray(200, 0.01))], AIR, 60.0, 0.9, "TM")
    r, t = open_slab(60.0, 0.9, 200, 9.0, 4 + 3j, zeta=0.01, digits=400)
    assert 0 < abs(t) < 1e-100
    assert_allclose([response.r, response.t], [r, t], rtol=1e-14)


W2_KP = 1930.92005  # a = 1 mm, r = 0.05 mm, lattice sum


@pytest.mark.parametrize(
    ("eps", "kp", "thickness", "frequency", "theta_deg", "r", "t"),
    [  # mode matching and parity closed form, two or three routes, derived here
        (1, 138, 0.1, 1e9, 60, -0.558284945 - 0.192024219j, -0.262517865 + 0.763235868j),
        (1, 138, 0.1, 2e9, 60, -0.235153608 + 0.205565099j, -0.625225795 - 0.715219180j),
        (2.1, W2_KP, 5e-3, 20e9, 45, -0.010831415 - 0.062012515j, -0.983132628 + 0.171718852j),
        (2.1, W2_KP, 5e-3, 20e9, 75, -0.187163684 - 0.369782827j, -0.811987222 + 0.410983173j),
        (2.1, W2_KP, 5e-3, 30e9, 75, -0.634913725 + 0.173361149j, -0.198312196 - 0.726293843j),
    ],
)
def test_open_wires_tabulated(eps, kp, thickness, frequency, theta_deg, r, t):
    response = free_slab(k0_of(frequency), theta_deg, kp, thickness, eps)
    assert_allclose([response.r, response.t], [r, t], rtol=0, atol=1e-8)
    assert abs(response.R + response.T - 1) < 1e-15
    assert abs(response.A) < 1e-30


@pytest.mark.parametrize(("frequency", "T"), [(1e9, 0.702131369), (2e9, 0.643516377)])
def test_local_model_tabulated(frequency, T):
    response = free_slab(k0_of(frequency), 60, 138, 0.1, model="local")  # uniaxial slab, derived here
    assert_allclose(response.T, T, rtol=0, atol=1e-9)


def test_local_model_is_the_limit_of_a_host_with_its_eps_zz():
    # TM kz^2 = eps (k0^2 - kx^2 / eps_zz), Fresnel and Airy sums with the admittance k0 eps / kz
    k0, theta, kp, eps, thickness, zeta = 50.0, 0.8, 138.0, 2.2 + 0.1j, 0.02, 3e-3 + 1e-3j
    eps_zz = complex(lattice.local_eps_zz(eps, kp, zeta, k0))
    kz = k0 * cmath.sqrt(eps * (1 - math.sin(theta) ** 2 / eps_zz))
    y, y0, p = k0 * eps / kz, 1 / math.cos(theta), cmath.exp(1j * kz * thickness)
    f = (y - y0) / (y + y0)  # of H, from air into the slab
    response = free_slab(k0, math.degrees(theta), kp, thickness, eps, "local", zeta=zeta)
    assert_allclose(response.r, f * (1 - p * p) / (1 - f * f * p * p), rtol=1e-13)
    assert_allclose(response.t, (1 - f * f) * p / (1 - f * f * p * p), rtol=1e-13)


def cut_in_parts(thickness, n, load):
    """Wires of kp = 138 /m in air in n equal layers, joined through a series load; None leaves them apart."""
    if load is None:
        return [Slab(1, 1, thickness / n, WireArray(138))] * n
    fronts = [Open()] + [Joined()] * (n - 1)
    backs = [Joined(load)] * (n - 1) + [Open()]
    return [
        Slab(1, 1, thickness / n, WireArray(138, front=front, back=back))
        for front, back in zip(fronts, backs, strict=True)
    ]


def test_a_cut_through_joined_wires_changes_nothing():
    parts = [
        Slab(1, 1, 0.03, WireArray(138, back=Joined())),
        Slab(1, 1, 0.07, WireArray(138, front=Joined())),
    ]
    response = solve(AIR, parts, AIR, k0_of(2e9), math.radians(60), "TM")
    whole = free_slab(k0_of(2e9), 60, 138, 0.1)
    assert_allclose([response.r, response.t], [whole.r, whole.t], rtol=1e-14)


def test_two_hosts_with_joined_wires():
    first = Slab(1.0, 1, 0.04, WireArray(138, back=Joined()))
    second = Slab(2.0, 1, 0.06, WireArray(138, front=Joined()))
    response = solve(AIR, [first, second], AIR, k0_of(2e9), math.radians(60), "TM")
    # integrated state equations, derived here
    assert_allclose(response.r, -0.578815792 - 0.109426065j, rtol=0, atol=1e-8)
    assert_allclose(response.t, 0.248764816 - 0.768839568j, rtol=0, atol=1e-8)
    turned = [
        replace(second, wires=WireArray(138, back=Joined())),
        replace(first, wires=WireArray(138, front=Joined())),
    ]
    backwards = solve(AIR, turned, AIR, k0_of(2e9), math.radians(60), "TM")
    assert_allclose(backwards.t, response.t, rtol=1e-14)
    assert_allclose(abs(backwards.r), abs(response.r), rtol=1e-14)


@pytest.mark.parametrize(("theta_deg", "r"), [(30, -0.583095065 + 0.812403929j), (60, -0.820802810 + 0.571211649j)])
def test_wires_on_a_ground_plane_are_half_of_a_free_slab(theta_deg, r):
    slab = Slab(1, 1, 0.05, WireArray(138, back=Grounded()))
    response = solve(AIR, [slab], PEC, k0_of(1e9), math.radians(theta_deg), "TM")
    assert_allclose(response.r, r, rtol=0, atol=1e-8)  # even part of the closed form, derived here
    assert_allclose(response.R, 1, rtol=1e-15)
    assert (response.t, response.T) == (None, 0)
    whole = free_slab(k0_of(1e9), theta_deg, 138, 0.1)
    assert_allclose(response.r, whole.r + whole.t, rtol=1e-13)


@pytest.mark.parametrize(("length", "ratio"), [(1e-3, 0.9984618559), (1e-4, 0.9999998819), (1e-5, 1.0000000000)])
def test_thin_slabs_of_wires_grounded_at_both_ends_tend_to_the_local_model(length, ratio):
    # H'/H = (kx^2 + kp^2) / [kx^2 coth(g L)/g - kp^2 cot(kh L)/kh] against -kz tan(kz L), derived here
    kp, theta = lattice.kp_lattice(2e-3, 2e-3, 5e-5), math.radians(60)
    slab = Slab(10.2, 1, length, WireArray(kp, front=Grounded(), back=Grounded()))
    r = [solve(AIR, [slab], PEC, k0_of(10e9), theta, "TM", model).r for model in ("nonlocal", "local")]
    admittance = [(1 - value) / (1 + value) for value in r]
    assert_allclose(admittance[0] / admittance[1], ratio, rtol=2e-9)


@pytest.mark.parametrize(
    ("frequency", "nonlocal_deg", "local_deg", "no_vias_deg"),
    [  # averaged patch admittance on the closed form above, exp(+j w t), derived here
        (8e9, 109.8319, 109.8046, 122.4177),
        (10e9, 34.7210, 34.4480, 78.8635),
        (12e9, -116.7782, -119.3051, 4.2248),
        (14e9, -5.3002, -4.4226, -64.3738),
    ],
)
def test_phase_of_mushrooms_at_60_degrees(frequency, nonlocal_deg, local_deg, no_vias_deg):
    k0, theta = k0_of(frequency), math.radians(60)
    wires = WireArray(lattice.kp_lattice(2e-3, 2e-3, 5e-5), front=Grounded(), back=Grounded())
    sheet = sheets.patches(k0, math.sin(theta), 2e-3, 0.2e-3, 1, 10.2)
    cases = [("nonlocal", wires, nonlocal_deg), ("local", wires, local_deg), ("local", None, no_vias_deg)]
    for model, vias, phase_deg in cases:
        r = solve(AIR, [sheet, Slab(10.2, 1, 1e-3, vias)], PEC, k0, theta, "TM", model).r
        assert_allclose(math.degrees(cmath.phase((-r).conjugate())), phase_deg, rtol=0, atol=1e-4)


def test_zero_phase_of_a_patch_on_a_grounded_slab():
    k0 = k0_of(11.650050868e9)  # derived here
    sheet = sheets.patches(k0, 0, 2e-3, 0.2e-3, 1, 10.2)
    r = solve(AIR, [sheet, Slab(10.2, 1, 1e-3)], PEC, k0, 0, "TE").r
    assert_allclose(r, 1, rtol=0, atol=1e-7)


def test_end_load_goes_from_grounded_to_open():
    def loaded(load):
        return free_slab(k0_of(2e9), 60, 138, 0.1, front=Grounded(load), back=Grounded(load))

    grounded = loaded(0)
    assert_allclose([grounded.R, grounded.T], [0.341292807, 0.658707193], rtol=0, atol=1e-9)  # derived here
    assert_allclose(loaded(1e-12j).r, grounded.r, rtol=1e-6)
    open_ends = free_slab(k0_of(2e9), 60, 138, 0.1)
    assert_allclose(loaded(1e9j).r, open_ends.r, rtol=1e-6)


def test_infinite_load_in_a_joint_opens_it():
    joined = cut_in_parts(0.1, 2, load=1e12)
    cut = cut_in_parts(0.1, 2, load=None)
    r = [solve(AIR, stack, AIR, k0_of(2e9), 1.0, "TM").r for stack in (joined, cut)]
    assert_allclose(r[0], r[1], rtol=1e-9)


def test_many_small_loads_in_joints_act_as_internal_impedance():
    k0, zeta, errors = k0_of(2e9), 4e-4 - 2e-4j, []
    distributed = solve(AIR, [Slab(1, 1, 0.1, WireArray(138, zeta))], AIR, k0, 1.0, "TM")
    for n in (8, 16):
        lumped = solve(AIR, cut_in_parts(0.1, n, load=zeta * 0.1 / n), AIR, k0, 1.0, "TM")
        errors.append(abs(lumped.r - distributed.r) + abs(lumped.t - distributed.t))
    assert errors[1] < 2e-3 * distributed.A
    assert errors[1] < errors[0] / 4  # at least second order in the distance of the loads


def test_loads_of_the_two_sides_of_a_joint_add():
    shares = [(0.3e-3, 0.7e-3), (1e-3, 0), (0, 1e-3)]
    responses = [
        solve(
            AIR,
            [
                Slab(1.5, 1, 0.02, WireArray(138, back=Joined(before))),
                Slab(3, 2, 0.03, WireArray(200, front=Joined(after), back=Grounded())),
            ],
            AIR,
            60.0,
            1.0,
            "TM",
        )
        for before, after in shares
    ]
    assert_allclose([x.r for x in responses], responses[0].r, rtol=1e-14)
    total = [sum(map(sum, x.end_loads)) for x in responses]
    assert_allclose(total, responses[0].A, rtol=1e-13)
    assert_allclose(responses[0].end_loads[0][1], 0.3 * total[0], rtol=1e-13)


@pytest.mark.parametrize(
    ("impedance", "R", "T", "A"),
    [  # mode matching, derived here; ohm/m
        (10, 0.09752449, 0.90217065, 0.00030485),
        (100, 0.09725761, 0.89969939, 0.00304300),
        (1e3, 0.09466201, 0.87545457, 0.02988342),
        (1e4, 0.07479838, 0.67387325, 0.25132836),
        (1e6, 0.00821875, 0.59569998, 0.39608127),
    ],
)
def test_resistive_wires(impedance, R, T, A):
    response = free_slab(k0_of(2e9), 60, 138, 0.1, zeta=lattice.zeta(impedance, 1e-4))
    assert_allclose([response.R, response.T, response.A], [R, T, A], rtol=0, atol=1e-8)
    assert_allclose(response.absorbed[0], response.A, rtol=1e-14)


def test_copper_wires():
    k0 = k0_of(2e9)
    impedance = lattice.round_wire_impedance(lattice.eps_of_conductor(5.8e7, k0), 1e-4, k0)
    assert_allclose(complex(impedance), 18.707497 - 18.568762j, rtol=1e-7)  # Bessel form, derived here
    response = free_slab(k0, 60, 138, 0.1, zeta=lattice.zeta(impedance, 1e-4))
    assert_allclose([response.R, response.T, response.A], [0.09759475, 0.90183491, 0.00057034], atol=1e-8)


@pytest.mark.parametrize(
    ("theta_deg", "R", "T", "A", "T_local"),
    [  # nanowires at 5 um, mode matching with the published lossy permittivity, derived here
        (30, 0.054911576, 0.944376878, 0.000711546, 0.943601640),
        (45, 0.001521595, 0.997067034, 0.001411371, 0.996284699),
        (60, 0.085147605, 0.912938152, 0.001914243, 0.918688461),
    ],
)
def test_drude_nanowires(theta_deg, R, T, A, T_local):
    k0, pitch, radius, eps_host = 2 * math.pi / 5e-6, 200e-9, 20e-9, 2.22
    omega = k0 * 299_792_458.0
    eps_metal = 1 - 1.37e16**2 / (omega * (omega + 2.73e13j))
    kp = lattice.kp_lattice(pitch, pitch, radius)
    impedance = lattice.thin_wire_impedance(eps_metal, radius, k0, eps_host)
    wires = {"kp": kp, "thickness": 1e-6, "eps": eps_host, "zeta": lattice.zeta(impedance, pitch**2)}
    response = free_slab(k0, theta_deg, **wires)
    assert_allclose([response.R, response.T, response.A], [R, T, A], rtol=0, atol=2e-9)
    # the tabulated local value is the volume mean of the permittivity: kp -> infinity
    mean = free_slab(k0, theta_deg, **(wires | {"kp": 1e6 * kp}), model="local")
    assert_allclose(mean.T, T_local, rtol=0, atol=2e-9)


@pytest.mark.parametrize(("polarization", "theta_deg", "T"), [("TE", 45, 0.92257857), ("TM", 0, 0.99843738)])
def test_wires_unseen_in_te_and_at_normal_incidence(polarization, theta_deg, T):
    k0, theta = k0_of(20e9), math.radians(theta_deg)
    slabs = [Slab(2.1, 1, 5e-3, wires) for wires in (None, WireArray(W2_KP))]
    host, wired = (solve(AIR, [slab], AIR, k0, theta, polarization) for slab in slabs)
    assert_allclose(host.T, T, rtol=0, atol=1e-8)  # dielectric slab, derived here
    assert_allclose([wired.r, wired.t], [host.r, host.t], rtol=1e-15)


def test_host_alone_in_tm():
    host = solve(AIR, [Slab(2.1, 1, 5e-3)], AIR, k0_of(20e9), math.radians(45), "TM")
    assert_allclose(host.T, 0.99427663, rtol=0, atol=1e-8)  # dielectric slab, derived here
