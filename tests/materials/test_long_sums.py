"""Sums by few nodes against the same sums term by term."""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.materials.long_sums import order_rule


@pytest.mark.parametrize(
    ("last", "count", "size"), [(0.3, 1, 1), (9.2, 10, 10), (16.0, 16, 16), (16.1, 32, 28), (3000.0, 4096, 112)]
)
def test_the_rule_reaches_as_far_as_asked_with_few_nodes(last, count, size):
    nodes, weights = order_rule(last)
    assert nodes.size == weights.size == size
    assert_allclose(weights.sum(), count, rtol=1e-14)
    assert np.all(np.diff(nodes) > 0.0)
    assert nodes[0] == 1.0
    assert nodes[-1] <= count


@pytest.mark.parametrize("power", [0, 1, 2, 5, 9, 23])
def test_polynomials_are_summed_exactly(power):
    nodes, weights = order_rule(500.0)
    exact = sum(m**power for m in range(1, 513))  # whole numbers: no rounding
    assert_allclose(np.sum(weights * nodes**power), float(exact), rtol=1e-12)


@pytest.mark.parametrize(
    "term",
    [
        lambda m: 1 / m,
        lambda m: 1 / (m + 0.4) ** 3,
        lambda m: 1 / (m - 0.9),
        lambda m: 1 / (np.sqrt(m**2 - 200j) + m),
        lambda m: 1 / np.sqrt(m**2 + 1e4),
        lambda m: m / (np.sqrt(m**2 - 1e4j) + m) ** 3,
    ],
)
def test_smooth_sequences_are_summed_to_rounding(term):
    nodes, weights = order_rule(4000.0)
    assert_allclose(np.sum(weights * term(nodes)), np.sum(term(np.arange(1.0, 4097.0))), rtol=1e-13)
