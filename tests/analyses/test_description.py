import numpy as np
import pytest
from scipy.special import j0

from slabsim.analyses.description import describe_stack
from slabsim.materials.dispersion import Constant
from slabsim.materials.material import Material
from slabsim.stack.directions import tilted
from slabsim.stack.sample import Film, Grid, Group, Layer, Mesh, Patches, Plates
from tests.engine.mixed_twins import axes_medium
from tests.engine.twins import GROUNDED, OPEN, medium, stack, wires

COPPER = Material("copper", Constant(1.0, 0.0, 5.8e7))


def numbers(eps=1.0, metal=COPPER, **array):
    """Derived numbers of one wire layer, 10 mm thick, from 1 to 10 GHz."""
    layer = Layer("slab", medium(eps), 10e-3, wires(10e-3, 0.1e-3, metal, **array))
    return describe_stack(stack(layer, frequencies=np.array([1e9, 10e9]))).wires[0]


def test_every_plasma_formula_is_listed_with_its_frequency():
    # kp and fp of a = 10 mm, r = 0.1 mm by the three formulas (closed forms of the literature)
    plasma = {value.formula: (value.kp, value.frequency) for value in numbers().plasma}
    assert plasma["lattice"] == pytest.approx((138.09760, 6.589113e9), rel=1e-6)
    assert plasma["logarithmic"] == pytest.approx((116.80652, 5.573242e9), rel=1e-6)
    assert plasma["gap"] == pytest.approx((139.49572, 6.655822e9), rel=1e-6)
    assert [value.formula for value in numbers().plasma if value.is_used] == ["lattice"]


def test_the_plasma_frequency_is_that_of_the_host_and_a_given_one_is_returned():
    assert numbers(eps=4.0).plasma[0].frequency == pytest.approx(6.589113e9 / 2, rel=1e-6)
    given = numbers(eps=4.0, plasma=5e9).plasma[-1]
    assert (given.formula, given.is_used) == ("given", True)
    assert given.frequency == pytest.approx(5e9, rel=1e-12)


def test_skin_depth_and_impedance_are_those_of_copper():
    # skin depth 2.089807 um at 1 GHz, 0.660855 um at 10 GHz (handbook formula sqrt(2/(w mu0 sigma)))
    assert numbers().skin_depth == pytest.approx((2.089807e-6, 0.660855e-6), rel=1e-5)
    assert numbers(metal=None).skin_depth is None
    assert numbers(metal=None).tem_loss_db == (0.0, 0.0)


def test_tem_loss_is_resistance_over_twice_the_line_impedance():
    # low-loss line: alpha = R/(2 Z), Z = sqrt(L/C) = eta0/(A kp^2)^(1/2)^2 (transmission-line textbook)
    found = numbers()
    line_impedance = 376.730313668 / (1e-4 * 138.09760**2)
    expected = found.impedance[1].real / (2 * line_impedance) * 10e-3 * 20 / np.log(10)
    assert found.tem_loss_db[1] == pytest.approx(expected, rel=0.03)


def test_local_permittivity_vanishes_at_the_plasma_edge():
    layer = Layer("slab", medium(2.25), 10e-3, wires(10e-3, 0.1e-3))
    edge = describe_stack(stack(layer)).wires[0].plasma[0].frequency
    found = describe_stack(stack(layer, frequencies=np.array([edge, 2 * edge]))).wires[0]
    assert abs(found.local_eps[0]) < 1e-12
    assert found.local_eps[1] == pytest.approx(0.75 * 2.25)


def test_rows_number_groups_and_name_sheets():
    plate = Layer("plate", medium(2.0, name="foam"), 1e-3)
    sample = stack(Patches("top", 2e-3, 0.2e-3), Group(3, (plate, Film("f", 100.0))), plate)
    rows = describe_stack(sample).rows
    assert [row.place for row in rows] == ["1", "2", "2.1", "2.2", "3"]
    assert [row.kind for row in rows] == ["patches", "group", "layer", "film", "layer"]
    assert rows[1].detail == "repeated 3 times:"
    assert rows[0].detail == "period 2 mm, gap 200 um"


FLAT_X, FLAT_30 = (1.0, 0.0, 0.0), tilted(90.0, 30.0)


def mesh(**more):
    return Mesh(2e-3, 50e-6, COPPER, (OPEN, GROUNDED), **more)


def test_rows_tell_direction_turn_and_ends_of_every_set():
    (slanted,), (flat,) = wires(2e-3, 5e-5, direction=tilted(20.0, 45.0)), wires(2e-3, 5e-5, direction=FLAT_X)
    crossed = Layer("", axes_medium((2.0, 3.0, 4.0)), 4e-3, (slanted, flat), rotation=np.deg2rad(30.0))
    joined = Layer("m", medium(1.0), 8e-3, mesh=mesh())
    first, second, _ = describe_stack(stack(crossed, joined, Patches("", 2e-3, 2e-4))).rows
    assert first.kind == "wire layer"
    assert first.detail == (
        "tilt 20 deg, azimuth 45 deg, ends open, open; along x; anisotropic, mean eps; turned by 30 deg"
    )
    assert first.eps[0] == pytest.approx(4.0**0.5 * 6.0**0.25, rel=1e-14)
    assert (second.kind, second.detail) == ("mesh layer", "mesh, ends open, grounded")


def test_rows_tell_grids_and_the_cut_off_between_plates():
    # c/(2 b sqrt(eps mu)) with b = 4 mm: 18.737 GHz for eps = 4, 13.249 GHz for mu = 2 as well (waveguide textbook)
    vent = [Plates("vent", 6e-3, 4e-3, normal, medium(4.0, mu)) for normal, mu in (("y", 1.0), ("x", 2.0))]
    grids = [Grid("g", 2e-3, 5e-5, metal, n) for metal, n in ((COPPER, FLAT_X), (None, FLAT_30))]
    rows = describe_stack(stack(*grids, *vent)).rows
    assert [(row.kind, row.thickness) for row in rows] == [("grid", None)] * 2 + [("plates", 6e-3)] * 2
    assert [(row.material, row.detail) for row in rows[:2]] == [
        ("copper", "along x, pitch 2 mm, radius 50 um"),
        ("perfect conductor", "azimuth 30 deg, pitch 2 mm, radius 50 um"),
    ]
    assert rows[2].detail == "normal to y, spacing 4 mm, cut-off 18.737 GHz"
    assert rows[3].detail == "normal to x, spacing 4 mm, cut-off 13.2491 GHz"


def test_notes_tell_where_diffraction_sets_in():
    # wires along y at 10 mm, plane of incidence xz: first order at f = c/(a (1 + sin theta)) (grating equation)
    grid = Grid("", 10e-3, 1e-4, None, (0.0, 1.0, 0.0))
    (note,) = describe_stack(stack(grid, angles_deg=np.array([0.0, 30.0]))).notes
    assert "sets in at 29.9792 GHz and 19.9862 GHz (0 and 30 deg); beyond it the map holds NaN." in note
    (note,) = describe_stack(stack(grid)).notes
    assert "sets in at 29.9792 GHz (0 deg); beyond" in note
    assert describe_stack(stack(Layer("", medium(2.0), 1e-3, wires()))).notes == ()


def test_every_set_and_mesh_has_its_own_numbers():
    crossed = Layer("c", medium(1.0), 4e-3, wires(2e-3, 5e-5) + wires(4e-3, 5e-5, direction=FLAT_X))
    given = Layer("m", medium(1.0), 4e-3, mesh=mesh(stiffness=1.7))
    found = describe_stack(stack(crossed, given, Layer("d", medium(1.0), 4e-3, mesh=mesh()))).wires
    assert [(one.layer, one.title) for one in found] == [
        ("c", "Wires 1"),
        ("c", "Wires 2"),
        ("m", "Mesh"),
        ("d", "Mesh"),
    ]
    assert [one.direction for one in found[:3]] == ["along z", "along x", "along x, y and z, joined"]
    assert found[0].fill_fraction == pytest.approx(4 * found[1].fill_fraction) == np.pi * 0.025**2
    assert found[2].fill_fraction == pytest.approx(3 * found[0].fill_fraction)  # three sets
    assert [one.tem_loss_db is None for one in found] == [False, True, True, True]
    assert [one.stiffness is None for one in found] == [True, True, False, False]
    assert found[2].stiffness == 1.7
    # l0 = 3/(1 + 2 kp^2/beta^2), 1/(beta a)^2 = (1/2 pi^2) sum [J0(2 pi n r/a)/n]^2: line charges on three sets
    n = np.arange(1, 3001)
    beta2 = 2 * np.pi**2 / np.sum((j0(2 * np.pi * n * 0.025) / n) ** 2)
    kp_a = found[3].plasma[0].kp * 2e-3
    assert found[3].stiffness == pytest.approx(3 / (1 + 2 * kp_a**2 / beta2), rel=1e-6)


def test_a_slanted_set_loses_along_its_own_length():
    upright, slanted = (
        describe_stack(
            stack(Layer("", medium(1.0), 4e-3, wires(2e-3, 5e-5, COPPER, direction=tilted(tilt, 0.0))))
        ).wires[0]
        for tilt in (0.0, 60.0)
    )
    assert slanted.tem_loss_db[0] == pytest.approx(2 * upright.tem_loss_db[0], rel=1e-12)
