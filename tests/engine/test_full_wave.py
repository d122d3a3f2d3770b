"""Against discrete wires: full-wave finite-element solutions of the periodic cell, `tests/reference/full_wave.json`.

The finite elements' own error is 1e-4 to 2e-3. The bounds here are those of the textbook models, not of the program.
"""

import json
from pathlib import Path

import numpy as np
import pytest

from slabsim.engine.response import Solver
from slabsim.stack.sample import Layer, Patches, Stack
from tests.engine.twins import C0, GROUNDED, medium, stack, wires

DATA = json.loads((Path(__file__).parent.parent / "reference" / "full_wave.json").read_text())
PITCH = 1e-3


def cell(case: dict) -> Stack:
    """The homogenised stack of a full-wave case."""
    host, thickness, radius = medium(case["eps_h"]), case.get("d_over_a", 3.0) * PITCH, case["r_over_a"] * PITCH
    if case["case"] in ("A1", "T1"):
        return stack(Layer("wires", host, thickness, wires(PITCH, radius)))
    if case["case"] == "C1":
        return stack(Layer("wires", host, thickness, wires(PITCH, radius, back=GROUNDED)), back=None)
    held = wires(PITCH, radius, front=GROUNDED, back=GROUNDED)
    return stack(Patches("patches", PITCH, 0.1 * PITCH), Layer("wires", host, thickness, held), back=None)


def rms_error(group: str, model: str) -> float:
    """Root mean square of the error in complex r and t over all cases of a group."""
    errors = []
    for case in (case for case in DATA["cases"] if case["case"] == group):
        frequency = case["k0a"] * C0 / (2 * np.pi * PITCH)
        response = Solver(cell(case), model, (case["pol"],)).solve(frequency, case["theta_deg"])
        letter = "H" if case["pol"] == "TM" else "E"  # r and t of equal surroundings: the same for E and H
        for name, value in (("r", response.r), ("t", response.t)):
            if value is not None and f"fullwave_{name}{letter}" in case:
                errors.append(value[0, 0, 0] - complex(*case[f"fullwave_{name}{letter}"]))
    return float(np.sqrt(np.mean(np.abs(errors) ** 2)))


@pytest.mark.parametrize(
    ("group", "nonlocal_bound", "local_at_least"), [("A1", 0.035, 0.4), ("C1", 0.055, 0.8), ("C2", 0.09, 0.8)]
)
def test_nonlocal_model_is_ten_times_closer_to_discrete_wires_than_the_local_one(group, nonlocal_bound, local_at_least):
    assert rms_error(group, "nonlocal") < nonlocal_bound
    assert rms_error(group, "local") > local_at_least


def test_te_misses_only_the_dressing_of_the_host_by_the_wires():
    assert rms_error("T1", "nonlocal") < 0.05
