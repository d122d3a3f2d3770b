"""Random stacks of every kind against the dense solution of `tests/reference`."""

import numpy as np
import pytest

from slabsim.engine.fields import absorbed_by_element
from slabsim.engine.response import Solver
from slabsim.stack.sample import Film, Layer, Patches, Stack, Strips
from tests.engine.twins import random_stack, reference

N_STACKS, N_GROUPS = 320, 16
DIGITS = 1e-10


def draw(seed: int) -> tuple[Stack, float, float, str]:
    """Stack, frequency [Hz], angle [degrees] and model of a seed; every third is lossless."""
    stack, frequency, angle_deg = random_stack(np.random.default_rng(seed), lossless=seed % 3 == 0)
    return stack, frequency, angle_deg, "local" if seed % 10 == 9 else "nonlocal"


@pytest.mark.parametrize("group", range(N_GROUPS))
def test_r_t_and_absorption_agree_with_the_dense_solution(group):
    for seed in range(group, N_STACKS, N_GROUPS):
        stack, frequency, angle_deg, model = draw(seed)
        response = Solver(stack, model).solve(frequency, angle_deg)
        for p, polarization in enumerate(("TE", "TM")):
            expected = reference(stack, frequency, angle_deg, polarization, model)
            assert abs(response.r[p, 0, 0] - expected.r) < DIGITS, (seed, polarization)
            if expected.t is not None:
                assert abs(response.t[p, 0, 0] - expected.t) < DIGITS * max(1.0, abs(expected.t)), (seed, polarization)
            absorbed = absorbed_by_element(stack, frequency, angle_deg, polarization, model)[:, 0]
            assert np.max(abs(absorbed - booked(stack, expected))) < DIGITS, (seed, polarization)


def booked(stack: Stack, expected) -> np.ndarray:
    """Loss per element of the reference, the loads counted as slabsim does: one in a joint with the layer before it."""
    loss = np.array(expected.absorbed) + [back for _, back in expected.end_loads]
    for i, element in enumerate(stack.flatten()):
        is_joined = isinstance(element, Layer) and element.wires and element.wires[0].ends[0].kind == "joined"
        loss[i - 1 if is_joined else i] += expected.end_loads[i][0]
    return loss


def test_the_sample_holds_every_kind_of_element_and_end():
    stacks = [draw(seed) for seed in range(N_STACKS)]
    elements = [(e, f) for s, f, _, _ in stacks for e in s.flatten()]
    layers = [(e, f) for e, f in elements if isinstance(e, Layer)]
    ends = [end for layer, _ in layers if layer.wires for end in layer.wires[0].ends]
    depths = [2 * np.pi * f * layer.thickness / 299_792_458 for layer, f in layers]
    counts = {
        "patches": sum(isinstance(e, Patches) for e, _ in elements),
        "strips": sum(isinstance(e, Strips) for e, _ in elements),
        "films": sum(isinstance(e, Film) for e, _ in elements),
        "open": sum(end.kind == "open" for end in ends),
        "grounded": sum(end.kind == "grounded" and end.load is None for end in ends),
        "loaded": sum(end.kind == "grounded" and end.load is not None for end in ends),
        "joined": sum(end.kind == "joined" and end.load is None for end in ends),
        "joined by a load": sum(end.kind == "joined" and end.load is not None for end in ends),
        "metal back": sum(s.back is None for s, *_ in stacks),
        "real metal": sum(layer.has_wires and layer.wires[0].metal is not None for layer, _ in layers),
        "negative host": sum(layer.material.permittivity(f).real < 0 for layer, f in layers),
        "magnetic": sum(layer.material.is_magnetic for layer, _ in layers),
        "thin": sum(depth < 0.01 for depth in depths),
        "thick": sum(depth > 50 for depth in depths),
        "grazing": sum(angle > 89.9 for _, _, angle, _ in stacks),
        "normal": sum(angle == 0.0 for _, _, angle, _ in stacks),
    }
    assert min(counts.values()) >= 10, counts
