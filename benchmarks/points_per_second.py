"""How many points a second does slabsim solve on one core, beside batched numpy?

    python benchmarks/points_per_second.py        (slabsim installed; about a minute)

Both sides solve r, t, R, T and A of TE and TM for the same stacks on the same grid in one thread, quantities of
frequency alone included. The numpy side, `batched_numpy.py`, is written for speed: blocks that fit the cache, and the
closed form where the wires are perfect conductors.

Read the ratio; the times are CPU times, each the best of many repeats taken in turn, and depend on the machine.
`difference` is the largest one of any r or t; above 1e-9 the two did not solve the same problem, and the exit
code is 1.

The first call of a new installation compiles. It is timed apart, and two lines follow from that very interpreter;
the table comes from the next one, which loads the compiled code as every later run does. Lines far from
those of the table say that the compiler put other code on disk than it ran.
"""

# ruff: noqa: E402
import os

for _library in ("OMP", "OPENBLAS", "MKL", "NUMBA"):
    os.environ[f"{_library}_NUM_THREADS"] = "1"  # read when numpy is imported

import subprocess
import sys
import tempfile
import time
from collections.abc import Callable

import numpy as np
from batched_numpy import batched

from slabsim.engine.response import Solver
from slabsim.materials.dispersion import Constant
from slabsim.materials.material import VACUUM, Material
from slabsim.stack.sample import Layer, Stack, Sweep, WireEnd, WireSet

N_LAYERS = (5, 20, 100)
KINDS = ("dielectric", "copper wires", "ideal wires")
CASES = {  # what an interpreter measures
    "compiling": [(20, kind) for kind in KINDS[:2]],
    "loading compiled code": [(n_layers, kind) for n_layers in N_LAYERS for kind in KINDS],
}
FREQUENCIES = np.linspace(5e9, 15e9, 101)  # [Hz]
ANGLES_DEG = np.linspace(0.0, 88.0, 181)
SECONDS, REPEATS = 4.0, (4, 60)  # spent on a stack; least and most repeats
TOLERANCE = 1e-9
OPEN = WireEnd("open")
COPPER = Material("copper", Constant(1.0, 0.0, 5.8e7))


def sample(n_layers: int, kind: str) -> Stack:
    """Layers all different, 1 to 6 mm thick, in vacuum; wires in every other one unless `kind` is dielectric."""
    rng = np.random.default_rng(3)
    metal = COPPER if kind == "copper wires" else None
    layers = []
    for index in range(n_layers):
        host = Material(f"host {index}", Constant(rng.uniform(1.2, 5.0), 1e-3))
        wires = WireSet((rng.uniform(3e-3, 6e-3),) * 2, rng.uniform(2e-5, 2e-4), metal, (OPEN, OPEN))
        has_wires = kind != "dielectric" and index % 2 == 0
        layers.append(Layer(f"layer {index}", host, rng.uniform(1e-3, 6e-3), (wires,) if has_wires else ()))
    return Stack(kind, VACUUM, VACUUM, tuple(layers), Sweep(FREQUENCIES, ANGLES_DEG, np.zeros(1)))


def cpu_seconds(solve: Callable[[], object]) -> float:
    """CPU time of one call [s]."""
    start = time.process_time()
    solve()
    return time.process_time() - start


def measure(n_layers: int, kind: str) -> bool:
    """Print a line of the table; true if both sides agree."""
    stack = sample(n_layers, kind)
    solver = Solver(stack)
    response, (r, t, *_) = solver.solve(FREQUENCIES, ANGLES_DEG), batched(stack, FREQUENCIES, ANGLES_DEG)
    difference = max(np.max(abs(response.r - r)), np.max(abs(response.t - t)))
    ours, theirs, end = [], [], time.perf_counter() + SECONDS
    while len(ours) < REPEATS[0] or (len(ours) < REPEATS[1] and time.perf_counter() < end):
        ours.append(cpu_seconds(lambda: solver.solve(FREQUENCIES, ANGLES_DEG)))
        theirs.append(cpu_seconds(lambda: batched(stack, FREQUENCIES, ANGLES_DEG)))
    ratio = min(theirs) / min(ours)
    per_layer = 1e9 / (FREQUENCIES.size * ANGLES_DEG.size * n_layers)
    print(
        f"{n_layers:6d}  {kind:12s}  {min(ours) * per_layer:10.2f}  {min(theirs) * per_layer:8.1f}  {ratio:6.1f}"
        f"  {difference:10.1e}  {len(ours):7d}{'  below 5' if ratio < 5.0 else ''}",
        flush=True,
    )
    return bool(difference < TOLERANCE)  # NaN fails


def run(first_call: str) -> int:
    """Time the first call of this interpreter, then print its lines; 1 if the two sides differ."""
    start = time.perf_counter()
    Solver(sample(2, "copper wires")).solve(FREQUENCIES[:2], ANGLES_DEG[:2])
    print(f"\nfirst call, {first_call}: {time.perf_counter() - start:.2f} s")
    print("layers  kind             slabsim     numpy   ratio  difference  repeats")
    agree = [measure(*case) for case in CASES[first_call]]
    if all(agree):
        return 0
    print(f"r or t differ by more than {TOLERANCE:g}: the two sides did not solve the same problem")
    return 1


def main() -> int:
    """One interpreter that compiles into an empty folder, one that finds its code there; 1 if the sides differ."""
    if len(sys.argv) > 1:
        return run(sys.argv[1])
    print(
        f"{FREQUENCIES.size} frequencies x {ANGLES_DEG.size} angles; ns of CPU per point (TE and TM) and layer",
        flush=True,
    )
    with tempfile.TemporaryDirectory() as cache:
        environment = os.environ | {"NUMBA_CACHE_DIR": cache}
        return max(subprocess.run((sys.executable, __file__, case), env=environment).returncode for case in CASES)


if __name__ == "__main__":
    sys.exit(main())
