"""Random stacks whose polarizations mix, at random azimuths, against the dense solution of `reference/mixed.py`."""

import numpy as np
import pytest

from slabsim.engine.fields import absorbed_by_element
from slabsim.engine.response import Solver
from slabsim.errors import InputError
from slabsim.stack.directions import tilted
from slabsim.stack.sample import Film, Grid, Layer, Patches, Stack, Strips, WireSet
from tests.engine.mixed_twins import axes_medium, random_mixed_stack, reference
from tests.engine.twins import GROUNDED, OPEN, medium, stack, wires

N_STACKS, N_GROUPS = 320, 16
DIGITS = 1e-10
CHANNELS = {"TE": (0, 0), "TM": (1, 1), "TE_to_TM": (0, 1), "TM_to_TE": (1, 0)}


def draw(seed: int) -> tuple[Stack, float, float, float, str]:
    """Stack, frequency [Hz], angle and azimuth [degrees], model of a seed; every third is lossless."""
    drawn = random_mixed_stack(np.random.default_rng(seed), lossless=seed % 3 == 0)
    return *drawn, "local" if seed % 8 == 7 else "nonlocal"


@pytest.mark.parametrize("group", range(N_GROUPS))
def test_jones_matrices_and_absorption_agree_with_the_dense_solution(group):
    for seed in range(group, N_STACKS, N_GROUPS):
        sample, frequency, angle_deg, azimuth_deg, model = draw(seed)
        response = Solver(sample, model, ("TE", "TM")).solve(frequency, angle_deg, azimuth_deg)
        expected = reference(sample, frequency, angle_deg, azimuth_deg, model)
        for row, channel in enumerate(response.channels):
            into, out = CHANNELS[channel]
            assert abs(response.r[row, 0, 0] - expected.r[into][out]) < DIGITS, (seed, channel)
            if expected.t is not None:
                t = expected.t[into][out]
                assert abs(response.t[row, 0, 0] - t) < DIGITS * max(1.0, abs(t)), (seed, channel)
                assert abs(response.T[row, 0, 0] - expected.T[into][out]) < DIGITS, (seed, channel)
        assert np.max(abs(response.A[:, 0, 0] - expected.A)) < DIGITS, seed
        for p, polarization in enumerate(("TE", "TM")):
            place = (frequency, angle_deg, polarization, model, azimuth_deg)
            absorbed = absorbed_by_element(sample, *place)[:, 0]
            assert np.max(abs(absorbed - booked(sample, expected, p))) < DIGITS, (seed, polarization)


def booked(sample: Stack, expected, p: int) -> np.ndarray:
    """Loss per element of the reference; a load in a joint counts with the layer in front, which gives it here."""
    assert not any(
        wires.ends[0].kind == "joined" and wires.ends[0].load
        for layer in sample.flatten()
        if isinstance(layer, Layer)
        for wires in layer.wires
    )
    return np.array(expected.absorbed[p]) + np.array(expected.end_loads[p])


def test_the_sample_holds_every_kind_of_element_and_end():
    drawn = [draw(seed) for seed in range(N_STACKS)]
    elements = [(e, f) for sample, f, *_ in drawn for e in sample.flatten()]
    layers = [(e, f) for e, f in elements if isinstance(e, Layer)]
    sets = [w for layer, _ in layers for w in layer.wires]
    ends = [end for w in sets if w.crosses_faces for end in w.ends]
    counts = {
        "tilted": sum(0 < w.direction[2] < 1 for w in sets),
        "normal": sum(w.is_normal for w in sets),
        "flat": sum(w.direction[2] == 0 for w in sets),
        "several sets": sum(len(layer.wires) > 1 for layer, _ in layers),
        "several that end": sum(sum(w.crosses_faces for w in layer.wires) > 1 for layer, _ in layers),
        "mesh": sum(layer.mesh is not None for layer, _ in layers),
        "host inductance": sum(w.inductance == "host" for w in sets),
        "anisotropic": sum(not layer.material.is_isotropic for layer, _ in layers),
        "negative along an axis": sum(
            bool(np.any(layer.material.permittivity_axes(f).real < 0)) for layer, f in layers
        ),
        "magnetic": sum(layer.material.is_magnetic for layer, _ in layers),
        "turned": sum(layer.rotation != 0 for layer, _ in layers),
        "real metal": sum(w.metal is not None for w in sets),
        "joined": sum(end.kind == "joined" for end in ends),
        "joined by a load": sum(end.kind == "joined" and end.load is not None for end in ends),
        "grounded": sum(end.kind == "grounded" for end in ends),
        "loaded": sum(end.kind == "grounded" and end.load is not None for end in ends),
        "grids": sum(isinstance(e, Grid) for e, _ in elements),
        "patches, strips, films": sum(isinstance(e, Patches | Strips | Film) for e, _ in elements),
        "metal back": sum(sample.back is None for sample, *_ in drawn),
        "normal incidence": sum(angle == 0.0 for _, _, angle, *_ in drawn),
        "grazing": sum(angle > 89.9 for _, _, angle, *_ in drawn),
        "azimuth along an axis": sum(azimuth in (0.0, 90.0) for *_, azimuth, _ in drawn),
    }
    assert min(counts.values()) >= 10, counts


def test_a_layer_with_many_sets():
    directions = [
        tilted(tilt, azimuth) for tilt, azimuth in ((20, 0), (30, 120), (50, -100), (0, 0), (90, 30), (90, 80))
    ]
    sets = tuple(
        WireSet((5e-3 + 1e-4 * k, 4e-3), 0.1e-3, None, (GROUNDED if k % 2 else OPEN, OPEN), direction=n)
        for k, n in enumerate(directions)
    )
    sample = stack(Film("film", 300.0), Layer("many", axes_medium((2.0, 2.2, 2.5 + 0.1j)), 8e-3, sets))
    response = Solver(sample, polarizations=("TE", "TM")).solve(11e9, 35.0, 20.0)
    expected = reference(sample, 11e9, 35.0, 20.0)
    for row, channel in enumerate(response.channels):
        into, out = CHANNELS[channel]
        assert abs(response.t[row, 0, 0] - expected.t[into][out]) < 1e-12
        assert abs(response.r[row, 0, 0] - expected.r[into][out]) < 1e-12


def test_more_sets_than_there_is_room_for_are_refused():
    sets = wires(5e-3, 0.1e-3, direction=(1.0, 0.0, 0.0)) * 17
    with pytest.raises(
        InputError, match='layer "many" has 17 sets of wires parallel to the faces; at most 16 are allowed'
    ):
        Solver(stack(Layer("many", medium(2.0), 8e-3, sets))).solve(1e10, 0.0)
