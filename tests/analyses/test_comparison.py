import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.analyses.comparison import compare_models
from slabsim.engine.response import Solver
from slabsim.errors import InputError
from slabsim.stack.sample import Film, Layer
from tests.engine.twins import GROUNDED, medium, stack, wires

GRID = {"frequencies": np.linspace(1e9, 5e9, 81), "angles_deg": np.array([0.0, 30.0, 60.0])}


def open_slab(**grid):
    """W1 of the published checks: kp = 138 /m, 100 mm, vacuum host, open ends."""
    return stack(Layer("slab", medium(1.0), 0.1, wires(10e-3, 0.1e-3)), **(GRID | grid))


def test_the_local_model_is_called_wrong_where_it_is_and_the_tem_resonance_named():
    # at 2 GHz and 60 deg T is 0.902 against 0.644 of the local model (check value computed in closed form)
    comparison = compare_models(open_slab())
    assert comparison.difference.shape == (2, 81, 3)
    assert abs(comparison.difference[1, 20, 2] - (0.643516 - 0.902446)) < 2e-3  # kp rounded to 138 there
    assert "not to be trusted" in comparison.verdicts["TM"]
    assert "exact" in comparison.verdicts["TE"]


def test_attached_and_thin_wires_are_called_local_with_that_reason():
    film = Film("film", 300.0)
    held = Layer("held", medium(4.0), 0.2e-3, wires(2e-3, 50e-6, front=GROUNDED, back=GROUNDED))
    comparison = compare_models(stack(film, held, back=None, **GRID))
    assert comparison.angles[-1].largest < 1e-3
    assert "good enough" in comparison.verdicts["TM"]
    assert "attached at both ends and the layers are thin" in comparison.verdicts["TM"]
    assert comparison.regions == ()


def test_a_local_difference_in_one_corner_is_called_a_small_region():
    grid = {"frequencies": np.linspace(6e9, 20e9, 281), "angles_deg": np.linspace(0, 75, 16)}
    held = Layer("held", medium(10.2 + 0.02j), 1e-3, wires(2e-3, 50e-6, front=GROUNDED, back=GROUNDED))
    comparison = compare_models(stack(Film("film", 2000.0), held, back=None, **grid), angles_deg=[0])
    assert "good outside a small region" in comparison.verdicts["TM"]
    assert "plasma edge" in comparison.verdicts["TM"]
    assert 0 < sum(region.share for region in comparison.regions) < 0.05


def test_normal_incidence_alone_is_called_exact():
    comparison = compare_models(open_slab(angles_deg=np.array([0.0])))
    assert "at normal incidence" in comparison.verdicts["TM"]
    assert comparison.angles[1].largest < 1e-12


def test_without_wires_there_is_one_model():
    comparison = compare_models(stack(Layer("plate", medium(2.0), 5e-3), **GRID))
    assert set(comparison.verdicts.values()) == {"No wires: the two models are the same."}


def test_summaries_and_regions_say_what_the_maps_hold():
    slab = open_slab()
    comparison = compare_models(slab, tolerance=0.05, angles_deg=[60])
    local, nonlocal_ = (
        Solver(slab, model).solve(slab.sweep.frequencies, slab.sweep.angles_deg).T for model in ("local", "nonlocal")
    )
    distance = abs(local - nonlocal_)
    for row in comparison.angles:
        column = distance[("TE", "TM").index(row.polarization), :, list(slab.sweep.angles_deg).index(row.angle_deg)]
        assert_allclose([row.largest, row.mean], [column.max(), column.mean()])
        assert slab.sweep.frequencies[np.argmax(column)] == row.largest_at
    shares = sum(region.share for region in comparison.regions)
    assert shares == pytest.approx(np.mean(distance[1] > 0.05))
    assert all(region.largest > 0.05 for region in comparison.regions)


def test_edges_of_both_models_stand_side_by_side():
    comparison = compare_models(open_slab(), angles_deg=[60])
    pairs = [pair for pair in comparison.bands if pair.polarization == "TE"]
    assert all(pair.trusted.lower == pytest.approx(pair.other.lower, rel=1e-11) for pair in pairs)
    assert any(pair.trusted is None or pair.other is None for pair in comparison.bands if pair.polarization == "TM")


@pytest.mark.parametrize("tolerance", [0.0, -1.0, 1.0, float("nan")])
def test_a_tolerance_out_of_bounds_is_refused(tolerance):
    with pytest.raises(InputError, match=r"tolerance = .*; it must lie between 0 and 1"):
        compare_models(open_slab(), tolerance=tolerance)
