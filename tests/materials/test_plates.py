"""The edge of metal plates against mode matching, a truncated linear system that knows nothing of products."""

from itertools import pairwise

import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.materials.plates import plate_edge, plates_diffract
from tests.reference.plates import mode_matching

SPACING = np.pi  # wavenumbers are then in units of pi/b


def edge(u, v, field):
    """r outside, r inside, t t' as the module's formulas give them."""
    e = plate_edge(np.array(u**2), np.array(v), SPACING, field)
    step, total = (e.outside - e.inside) / (e.outside + e.inside), e.outside + e.inside
    through = 4 * e.outside * e.inside / total**2 * e.phase_outside * e.phase_inside
    return np.array([step * e.phase_outside, -step * e.phase_inside, through])


CONDUCTING, PLASMA = np.sqrt(3.0 + 6.0j), np.sqrt(-4.0 + 0.1j)


@pytest.mark.parametrize(
    ("field", "u", "v"),
    [
        ("along", 1.3, 0.0), ("along", 1.3, 0.4), ("along", 0.8, 0.3), ("along", 1.0001, 0.3), ("along", 1.5, 0.49),
        ("across", 0.8, 0.3), ("across", 0.6, 0.55), ("across", 0.9, 0.0),
        ("along", CONDUCTING, 0.3), ("across", CONDUCTING, 0.3), ("along", PLASMA, 0.6), ("across", PLASMA, 0.6),
    ],
)  # fmt: skip
def test_the_edge_is_what_mode_matching_tends_to(field, u, v):
    # the error of mode matching is a series of powers of 1/N (1e-3 at N = 200); extrapolated, it leaves 2e-9
    table = [mode_matching(u, v, field, n) for n in (25, 50, 100, 200)]
    for order in (1, 2, 3):
        table = [(2**order * fine - coarse) / (2**order - 1) for coarse, fine in pairwise(table)]
    assert_allclose(edge(u, v, field), table[0], atol=1e-8)


@pytest.mark.parametrize(("u", "v"), [(1.3, 0.4), (1.6, 0.0), (1.1, 0.8)])
def test_the_edge_reflects_as_carlson_and_heins_found(u, v):
    # Q. Appl. Math. 4, 313 (1947): |r| = (kz0 - kappa)/(kz0 + kappa), and no power is lost
    outside, inside, through = edge(u, v, "along")
    kz, kappa = np.sqrt(u**2 - v**2), np.sqrt(u**2 - 1)
    assert_allclose(abs(outside), abs(kz - kappa) / (kz + kappa), rtol=1e-12)
    assert_allclose(abs(inside), abs(outside), rtol=1e-12)
    assert_allclose(abs(outside) ** 2 + abs(through), 1.0, rtol=1e-12)


def test_a_field_across_reflects_by_tan_squared_of_half_the_angle():
    # Q. Appl. Math. 5, 82 (1947), from memory: |r| = tan^2(theta/2)
    for theta in (0.2, 0.7, 1.2):
        outside, _, _ = edge(0.8, 0.8 * np.sin(theta), "across")
        assert_allclose(abs(outside), np.tan(theta / 2) ** 2, rtol=1e-12)


def test_below_cut_off_everything_comes_back():
    outside, _, _ = edge(0.7, 0.2, "along")
    assert_allclose(abs(outside), 1.0, rtol=1e-12)


def test_the_edge_is_smooth_through_cut_off_and_at_grazing_incidence():
    for u, v in ((1.0, 0.3), (1.2, 1.2 - 1e-12)):
        near = [edge(u * (1 + shift), v, "along") for shift in (1e-10, 2e-10)]
        assert np.all(np.isfinite(near))
        assert_allclose(near[0], near[1], atol=1e-3)  # kz falls as the root of the distance


@pytest.mark.parametrize(
    ("u2", "v", "field"),
    [
        (1.4**2, 0.45, "along"), (0.9**2, 0.8, "across"),
        (40 + 80j, 0.3, "along"), (2 + 3000j, 0.3, "across"), (-60 + 0.1j, 0.7, "along"), (-900 + 5j, 0.7, "across"),
    ],
)  # fmt: skip
def test_more_factors_change_nothing(monkeypatch, u2, v, field):
    before = edge(np.sqrt(u2), v, field)
    monkeypatch.setattr("slabsim.materials.plates._REACH", 60.0)
    assert_allclose(edge(np.sqrt(u2), v, field), before, rtol=2e-12)


@pytest.mark.parametrize(
    ("field", "u", "v", "marked"),
    [
        ("along", 1.59, 0.4, False), ("along", 1.61, 0.4, True),
        ("along", 1.99, 0.0, False), ("along", 2.01, 0.0, True),
        ("across", 0.99, 0.4, False), ("across", 1.01, 0.4, True),
        ("across", 1.01, 0.0, False), ("across", 2.01, 0.0, True),
    ],
)  # fmt: skip
def test_onset_of_a_second_order_or_mode(field, u, v, marked):
    assert bool(plates_diffract(np.array(u**2), np.array(v), SPACING, field)) is marked
