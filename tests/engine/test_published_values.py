"""Check values through slabsim's own solver.

"derived": computed in closed form from the published model (nonlocal permittivity of Belov et al., Phys. Rev. B 67,
113103 (2003), additional boundary condition of Silveirinha, IEEE Trans. Antennas Propag. 54, 1766 (2006)) by routes
that share nothing with slabsim. "textbook": multilayer optics and circuit formulas.
"""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.engine.response import Solver
from slabsim.materials.dispersion import Drude
from slabsim.materials.material import Material
from slabsim.stack.sample import Film, Layer, Patches, Strips, WireSet
from tests.engine.twins import C0, GROUNDED, JOINED, OPEN, medium, stack, wires

TE, TM = 0, 1


def w1(thickness=0.1, eps=1.0, ends=(OPEN, OPEN)) -> Layer:
    """Wires of kp = 138 /m exactly, 100 mm unless told otherwise."""
    plasma = 138.0 * C0 / (2 * np.pi) / np.sqrt(eps)
    return Layer("w1", medium(eps), thickness, (WireSet((10e-3, 10e-3), 0.1e-3, None, ends, plasma),))


def solve(sample, frequency, angle_deg, model="nonlocal"):
    """r, t, R, T of TE and TM at one point."""
    response = Solver(sample, model).solve(frequency, angle_deg)
    return [None if x is None else x[:, 0, 0] for x in (response.r, response.t, response.R, response.T)]


@pytest.mark.parametrize(
    ("ghz", "angle", "t", "r", "local"),
    [  # derived
        (1, 30, -0.459572292 + 0.877124124j, -0.123522773 - 0.064720195j, 0.984124586),
        (1, 60, -0.262517865 + 0.763235868j, -0.558284945 - 0.192024219j, 0.702131369),
        (2, 30, -0.558926208 - 0.826943062j, -0.050847966 + 0.034367857j, 0.980734599),
        (2, 60, -0.625225795 - 0.715219180j, -0.235153608 + 0.205565099j, 0.643516377),
        (5, 30, -0.614872088 - 0.785325989j, 0.056753265 - 0.044435049j, 0.984931482),
        (5, 60, -0.901653133 - 0.366386781j, 0.086488683 - 0.212842809j, 0.551809931),
    ],
)
def test_open_wires_in_vacuum(ghz, angle, t, r, local):
    found = solve(stack(w1()), ghz * 1e9, angle)
    assert_allclose([found[1][TM], found[0][TM]], [t, r], atol=2e-9)
    assert_allclose(solve(stack(w1()), ghz * 1e9, angle, "local")[3][TM], local, atol=2e-9)


@pytest.mark.parametrize(
    ("ghz", "angle", "T", "local"),
    [  # derived; a = 1 mm, r = 0.05 mm, eps 2.1, 5 mm
        (10, 45, 0.998927187, 0.999543894),
        (20, 75, 0.828230417, 0.998641573),  # 0.5987 would follow from the wrong condition "Ez continuous"
        (30, 75, 0.566830474, 0.398272388),
    ],
)
def test_open_wires_in_a_dense_host(ghz, angle, T, local):
    sample = stack(Layer("w2", medium(2.1), 5e-3, wires(1e-3, 0.05e-3)))
    assert_allclose(solve(sample, ghz * 1e9, angle)[3][TM], T, atol=2e-8)
    assert_allclose(solve(sample, ghz * 1e9, angle, "local")[3][TM], local, atol=2e-8)


def test_wires_that_run_through_two_hosts():  # derived
    front, back = w1(40e-3, 1.0, (OPEN, JOINED)), w1(60e-3, 2.0, (JOINED, OPEN))
    r, t, R, _ = solve(stack(front, back), 2e9, 60)
    assert_allclose([r[TM], t[TM]], [-0.578815792 - 0.109426065j, 0.248764816 - 0.768839568j], atol=1e-8)
    assert_allclose(R[TM], 0.347001785, atol=1e-8)


@pytest.mark.parametrize(("angle", "r"), [(30, -0.583095065 + 0.812403929j), (60, -0.820802810 + 0.571211649j)])
def test_wires_on_ground(angle, r):  # derived
    sample = stack(w1(0.05, ends=(OPEN, GROUNDED)), back=None)
    assert_allclose(solve(sample, 1e9, angle)[0][TM], r, atol=1e-8)


@pytest.mark.parametrize(
    ("ghz", "nonlocal_deg", "local_deg"),
    [(8, 109.8319, 109.8046), (10, 34.7210, 34.4480), (12, -116.7782, -119.3051), (14, -5.3002, -4.4226)],
)
def test_phase_of_patches_on_wires(ghz, nonlocal_deg, local_deg):
    # derived; geometry as in Luukkonen et al., IEEE Trans. Microw. Theory Tech. 57, 2692 (2009), from memory.
    # Phase of the reflected E in exp(+jwt): minus that of r_H, turned by 180 deg
    held = Layer("held", medium(10.2), 1e-3, wires(2e-3, 0.05e-3, front=GROUNDED, back=GROUNDED))
    sample = stack(Patches("patches", 2e-3, 0.2e-3), held, back=None)
    for model, expected in (("nonlocal", nonlocal_deg), ("local", local_deg)):
        assert np.rad2deg(np.angle(np.conj(-solve(sample, ghz * 1e9, 60, model)[0][TM]))) == pytest.approx(
            expected, abs=3e-3
        )


@pytest.mark.parametrize(
    ("angle", "R", "T"),
    [(30, 0.054911576, 0.944376878), (45, 0.001521595, 0.997067034), (60, 0.085147605, 0.912938152)],
)
def test_gold_nanowires_are_near_the_thin_wire_values(angle, R, T):
    # derived from Silveirinha, Phys. Rev. E 73, 046612 (2006), for wires thin against the skin depth; the skin effect,
    # which slabsim takes into account, moves R and T by up to 6e-4
    gold = Material("gold", Drude(1.37e16 / (2 * np.pi), 2.73e13 / (2 * np.pi)))
    sample = stack(Layer("film", medium(2.22), 1e-6, wires(200e-9, 20e-9, gold)))
    found = solve(sample, C0 / 5e-6, angle)
    assert_allclose([found[2][TM], found[3][TM]], [R, T], atol=7e-4)


def test_patches_and_strips_in_air_are_dual():  # circuit formulas of the sheets; T^2 and R^2 0.942270562
    T = solve(stack(Patches("p", 2e-3, 0.2e-3)), 10e9, 0)[3]
    R = solve(stack(Strips("s", 2e-3, 0.2e-3)), 10e9, 0)[2]
    assert_allclose(np.concatenate([T, R]), 0.942270562, atol=1e-8)


def test_resistive_film_of_half_the_wave_impedance():  # textbook
    film = stack(Film("film", 376.730313668 / 2))
    _, _, R, T = solve(film, 1e9, 0)
    assert_allclose([*R, *T], 0.25, atol=1e-10)
    _, _, R, T = solve(film, 1e9, 60)
    assert_allclose([T[TE], R[TE], T[TM], R[TM]], [1 / 9, 4 / 9, 4 / 9, 1 / 9], atol=1e-10)


@pytest.mark.parametrize(("x", "R"), [(0.5, 0.2), (0.75, 0.041129061), (1.0, 0.0)])
def test_quarter_wave_film_absorber(x, R):  # textbook: |r|^2 = cot^2/(4 + cot^2)
    sample = stack(Film("film", 376.730313668), Layer("air", medium(1.0), C0 / 10e9 / 4), back=None)
    assert_allclose(solve(sample, x * 10e9, 0)[2], R, atol=1e-9)


@pytest.mark.parametrize(
    ("angle", "Rs", "Rp"),
    [(30, 0.0577961054, 0.0252491465), (60, 0.1765714881, 0.0018019375), (80, 0.5385949057, 0.2368138036)],
)
def test_fresnel_at_glass(angle, Rs, Rp):  # textbook, 1 to 1.5
    assert_allclose(solve(stack(back=medium(2.25)), 1e9, angle)[2], [Rs, Rp], atol=1e-9)


@pytest.mark.parametrize(("pairs", "R"), [(1, 0.3374508449), (5, 0.9724312379), (8, 0.9981726588)])
def test_quarter_wave_mirror(pairs, R):  # textbook: ((1 - Y)/(1 + Y))^2, Y = (2.3/1.46)^2N 1.52
    f = 1e9
    high, low = (Layer(str(n), medium(n**2), C0 / f / n / 4) for n in (2.3, 1.46))
    assert_allclose(solve(stack(*(high, low) * pairs, back=medium(1.52**2)), f, 0)[2], R, atol=1e-9)


@pytest.mark.parametrize(("gap", "Ts", "Tp"), [(0.1, 0.8776952955, 0.9483773156), (1.0, 0.0170471784, 0.0425102755)])
def test_frustrated_total_reflection(gap, Ts, Tp):  # textbook, 1.5/air/1.5 at 45 deg
    sample = stack(Layer("gap", medium(1.0), gap * C0 / 1e9), front=medium(2.25), back=medium(2.25))
    assert_allclose(solve(sample, 1e9, 45)[3], [Ts, Tp], atol=1e-9)


def test_absorbing_layer_on_glass():  # textbook: p and s of n = 2 + 0.1i, 0.3 wavelengths, on 1.5, 40 deg
    sample = stack(Layer("layer", medium((2 + 0.1j) ** 2), 0.3 * C0 / 1e9), back=medium(2.25))
    _, _, R, T = solve(sample, 1e9, 40)
    assert_allclose([R[TM], T[TM], R[TE], T[TE]], [0.0410858683, 0.6359658612, 0.1453987610, 0.5605101582], atol=1e-9)


def test_prism_coupled_plasmon():
    # textbook: 50 nm of eps -18.2 + 0.5i on n = 1.515 at 632.8 nm has its dip of 0.0213855 at 42.81353 deg
    sample = stack(Layer("metal", medium(-18.2 + 0.5j), 50e-9), front=medium(1.515**2))
    assert solve(sample, C0 / 632.8e-9, 42.81353)[2][TM] == pytest.approx(0.0213855, abs=1e-6)


@pytest.mark.parametrize("angle", [0.0, 35.0, 70.0])
def test_slab_of_index_minus_one_reverses_the_phase(angle):  # textbook: R = 0, t = exp(-i kz d)
    r, t, *_ = solve(stack(Layer("dense", medium(-1.0, -1.0), 0.1)), 1e9, angle)
    expected = np.exp(-2j * np.pi * 1e9 / C0 * np.cos(np.deg2rad(angle)) * 0.1)
    assert_allclose(t, expected, atol=1e-10)
    assert_allclose(r, 0.0, atol=1e-10)
