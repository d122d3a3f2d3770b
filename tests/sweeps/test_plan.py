"""How a sweep is cut into blocks."""

import numpy as np
import pytest

from slabsim.errors import InputError
from slabsim.sweeps.plan import POINTS_PER_BLOCK, SweepPlan
from tests.store.demo import demo_stack


@pytest.mark.parametrize(
    ("n_freqs", "n_angles", "block_shape"),
    [
        (351, 81, (351, 81)),  # 28431 points: one block
        (1000, 400, (77, 400)),  # 13 nearly equal parts of at most 81 frequencies
        (10, 100_000, (1, 25_000)),  # a row of angles alone is too long: 4 parts
        (1, 1, (1, 1)),
        (100_000, 1, (25_000, 1)),
    ],
)
def test_blocks_are_nearly_equal_and_not_too_large(n_freqs, n_angles, block_shape):
    plan = SweepPlan.of(demo_stack(n_freqs, n_angles).sweep)
    assert plan.block_shape == block_shape
    assert np.prod(plan.block_shape) <= POINTS_PER_BLOCK


@pytest.mark.parametrize(("grid", "block"), [((2, 13, 7), (5, 3)), ((1, 1, 1), (1, 1)), ((3, 4, 6), (2, 3))])
def test_blocks_cover_every_point_once(grid, block):
    plan = SweepPlan(grid, block)
    hits = np.zeros(grid, dtype=int)
    n_points = 0
    for index in range(plan.n_blocks):
        place = plan.place(index)
        hits[place.azimuth, place.frequencies, place.angles] += 1
        n_points += place.n_points
        assert place.shape == hits[place.azimuth, place.frequencies, place.angles].shape
    assert np.all(hits == 1)
    assert n_points == plan.n_points == np.prod(grid)


def test_blocks_are_counted_as_their_flags_lie_in_memory():
    plan = SweepPlan((2, 13, 7), (5, 3))
    assert plan.block_counts == (2, 3, 3)
    for index in range(plan.n_blocks):
        azimuth, row, column = np.unravel_index(index, plan.block_counts)
        place = plan.place(index)
        assert (place.azimuth, place.frequencies.start, place.angles.start) == (azimuth, 5 * row, 3 * column)


def test_a_block_is_never_larger_than_the_grid():
    assert SweepPlan.of(demo_stack(4, 3).sweep, block_shape=(100, 100)).block_shape == (4, 3)


def test_impossible_plans_are_refused():
    with pytest.raises(InputError, match=r"blocks of \(0, 3\); every number must be at least 1"):
        SweepPlan((1, 4, 3), (0, 3))
    with pytest.raises(InputError, match="block 4; the sweep has blocks 0 to 3"):
        SweepPlan((1, 4, 3), (1, 3)).place(4)
