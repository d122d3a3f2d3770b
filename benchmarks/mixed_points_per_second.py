"""How fast is the four-port engine on one core, beside batched numpy eigen-solutions of the same 6 x 6 problem?

    python benchmarks/mixed_points_per_second.py        (slabsim installed; about half a minute)

Stacks of different layers with one set of wires each, in vacuum, at an azimuth where the polarizations mix. Both
sides give the four t of TE and TM for the same grid in one thread. Read the ratio; the times are CPU times, the best
of several repeats taken in turn. `difference` is the largest one of any t; above 1e-8 the exit code is 1.

Layers without tilt ("mirror") take the half-size form of the engine, tilted ones the full form.
"""

# ruff: noqa: E402
import os

for _library in ("OMP", "OPENBLAS", "MKL", "NUMBA"):
    os.environ[f"{_library}_NUM_THREADS"] = "1"  # read when numpy is imported

import sys
import time

import numpy as np
from batched_eigen import batched_eigen

from slabsim.engine.response import Solver
from slabsim.materials.dispersion import Constant
from slabsim.materials.material import VACUUM, Material
from slabsim.stack.directions import tilted
from slabsim.stack.sample import Layer, Stack, Sweep, WireEnd, WireSet

FREQUENCIES, ANGLES_DEG, AZIMUTH_DEG = np.linspace(5e9, 15e9, 41), np.linspace(0.5, 80.0, 61), 33.0
N_LAYERS, KINDS, REPEATS = (1, 5, 20), ("mirror", "tilted"), 3
TOLERANCE, WANTED = 1e-8, 10.0
ENDS = (WireEnd("open"), WireEnd("open"))


def sample(n_layers: int, kind: str) -> Stack:
    """Layers all different, 1 to 6 mm thick, in lossy anisotropic hosts."""
    rng = np.random.default_rng(3)
    layers = []
    for index in range(n_layers):
        host = Material(f"host {index}", tuple(Constant(value, 1e-3) for value in rng.uniform(1.2, 5.0, 3)))
        direction = (0.0, 0.0, 1.0) if kind == "mirror" else tilted(rng.uniform(10, 50), rng.uniform(-180, 180))
        pitch = rng.uniform(3e-3, 6e-3)
        wires = WireSet((pitch, pitch), rng.uniform(2e-5, 2e-4), None, ENDS, direction=direction)
        layers.append(Layer(f"layer {index}", host, rng.uniform(1e-3, 6e-3), (wires,)))
    return Stack(kind, VACUUM, VACUUM, tuple(layers), Sweep(FREQUENCIES, ANGLES_DEG, np.array([AZIMUTH_DEG])))


def measure(n_layers: int, kind: str) -> bool:
    """Print a line of the table; true if both sides agree."""
    stack = sample(n_layers, kind)
    grid = FREQUENCIES, ANGLES_DEG, AZIMUTH_DEG
    solver = Solver(stack)
    ours, theirs = solver.solve(*grid).t, batched_eigen(stack, *grid)
    theirs = np.array([theirs[0, 0], theirs[1, 1], theirs[0, 1], theirs[1, 0]])
    difference = np.max(abs(ours - theirs))
    times = np.empty((2, REPEATS))
    for k in range(REPEATS):
        for side, solve in enumerate((lambda: solver.solve(*grid), lambda: batched_eigen(stack, *grid))):
            start = time.process_time()
            solve()
            times[side, k] = time.process_time() - start
    fast, slow = times.min(axis=1) * 1e6 / (FREQUENCIES.size * ANGLES_DEG.size * n_layers)
    note = "" if slow > WANTED * fast else f"  below {WANTED:g}"
    print(
        f"{n_layers:6d}  {kind:8s}  {fast:9.3f}  {slow:8.1f}  {slow / fast:6.1f}  {difference:10.1e}{note}", flush=True
    )
    return bool(difference < TOLERANCE)  # NaN fails


def main() -> int:
    """The table; 1 if the two sides differ."""
    print(f"{FREQUENCIES.size} frequencies x {ANGLES_DEG.size} angles; us of CPU per point (both waves) and layer")
    print("layers  kind        slabsim     numpy   ratio  difference")
    agree = [measure(n_layers, kind) for kind in KINDS for n_layers in N_LAYERS]
    if all(agree):
        return 0
    print(f"t differs by more than {TOLERANCE:g}: the two sides did not solve the same problem")
    return 1


if __name__ == "__main__":
    sys.exit(main())
