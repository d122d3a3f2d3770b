import numpy as np
import pytest

from slabsim.analyses.description import describe_stack
from slabsim.materials.dispersion import Constant
from slabsim.materials.material import Material
from slabsim.stack.sample import Film, Group, Layer, Patches
from tests.engine.twins import medium, stack, wires

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
