"""What does a map cost: bytes and time per point, and memory?

    python benchmarks/map_size.py        (slabsim installed; two minutes and 1 GB in the folder for temporary files)

Maps of a copper wire slab between two skins, TE and TM, are written by `run_sweep`; each line is an interpreter of
its own. TMPDIR chooses the folder, and with it the disk.

First table: bytes per point of the file, beside the bytes of the bare numbers (8 for each quantity and
polarization); the rest is the copy that viewers plot, and the axes. The time is the wall time of the sweep, and
`sweep / solve` is its ratio to solving the same blocks without writing anything, timed in turn in the same
interpreter: near 1, the map costs nothing.

Second table: the peak of resident memory, and how far it lies above that of a map of two thousand points. It must not
grow with the number of points, since memory holds one block.
"""

import json
import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

N_ANGLES = 1000
REPEATS = 3
TEXT = """
title = "copper wire slab between skins"
[material.foam]
permittivity = 1.07
loss_tangent = 2e-4
[material.laminate]
permittivity = 3.4
loss_tangent = 2e-3
[material.copper]
conductivity = "5.8e7 S/m"
[[layer]]
name = "front skin"
material = "laminate"
thickness = "0.5 mm"
[[layer]]
name = "wire slab"
material = "foam"
thickness = "10 mm"
[[layer.wires]]
pitch = "2 mm"
radius = "50 um"
metal = "copper"
ends = ["open", "open"]
[[layer]]
name = "back skin"
material = "laminate"
thickness = "0.5 mm"
[sweep]
spectrum = {{ from = "5 GHz", to = "40 GHz", points = {n_freqs} }}
angle = {{ from = "0 deg", to = "80 deg", points = {n_angles} }}
polarization = ["TE", "TM"]
store = {store}
"""
POWERS, ALL = ["power"], ["power", "amplitude"]
BYTES = {len(POWERS): 3 * 2 * 8, len(ALL): 7 * 2 * 8}  # quantities, polarizations, float64


# --- one interpreter, one map; slabsim and numpy are imported here alone -------------------------------


def write_map(n_freqs: int, store: list[str], compress: bool, repeats: int) -> dict[str, float]:
    """Size [bytes], best wall times [s] of the sweep and of the bare solution, peak memory [bytes]."""
    from slabsim.engine.response import Solver
    from slabsim.stack.reader import parse_stack
    from slabsim.sweeps.plan import SweepPlan
    from slabsim.sweeps.run import run_sweep

    stack = parse_stack(TEXT.format(n_freqs=n_freqs, n_angles=N_ANGLES, store=json.dumps(store)))
    solver, plan = Solver(stack), SweepPlan.of(stack.sweep)
    solver.solve(stack.sweep.frequencies[:1], stack.sweep.angles_deg[:2])  # compiles
    sweeps, solutions = [], []
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "map.h5"
        for _ in range(repeats):
            start = time.perf_counter()
            report = run_sweep(stack, path, plan=plan, replace=path.exists(), compress=compress)
            sweeps.append(time.perf_counter() - start)
            assert report.is_complete
            start = time.perf_counter()
            for place in map(plan.place, range(plan.n_blocks)):
                solver.solve(stack.sweep.frequencies[place.frequencies], stack.sweep.angles_deg[place.angles])
            solutions.append(time.perf_counter() - start)
        size = path.stat().st_size
    unit = 1 if sys.platform == "darwin" else 1024  # of ru_maxrss
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * unit
    return {"size": size, "sweep": min(sweeps), "solve": min(solutions), "peak": peak}


# --- the tables --------------------------------------------------------------------------------------


def measured(n_freqs: int, store: list[str], compress: bool, repeats: int) -> dict[str, float]:
    """`write_map` in an interpreter of its own."""
    # ru_maxrss of a child starts at the size of its parent: this one imports nothing large
    task = json.dumps([n_freqs, store, compress, repeats])
    done = subprocess.run((sys.executable, __file__, task), stdout=subprocess.PIPE, text=True, check=True)
    return json.loads(done.stdout)


def print_sizes(n_freqs: int) -> None:
    """First table."""
    n_points = n_freqs * N_ANGLES
    print(f"{n_points:.3g} points, TE and TM; best of {REPEATS}")
    print("kept             compressed  bytes/point  / bare  written points/s  solved points/s  sweep / solve")
    for store in (POWERS, ALL):
        for compress in (False, True):
            got = measured(n_freqs, store, compress, REPEATS)
            per_point = got["size"] / n_points
            print(
                f"{'+'.join(store):15s}  {'yes' if compress else 'no':10s}  {per_point:11.1f}"
                f"  {per_point / BYTES[len(store)]:6.2f}  {n_points / got['sweep']:16.3g}"
                f"  {n_points / got['solve']:15.3g}  {got['sweep'] / got['solve']:13.2f}",
                flush=True,
            )


def print_memory(frequency_counts: tuple[int, ...]) -> None:
    """Second table."""
    base = measured(2, ALL, False, 1)["peak"]
    print(f"\npeak memory; of a map of {2 * N_ANGLES} points: {base / 1e6:.0f} MB")
    print("  points   peak MB  above MB  / that of the smallest")
    above_first = None
    for n_freqs in frequency_counts:
        peak = measured(n_freqs, ALL, False, 1)["peak"]
        above_first = above_first or peak - base
        print(
            f"{n_freqs * N_ANGLES:8.0e}  {peak / 1e6:8.1f}  {(peak - base) / 1e6:8.1f}"
            f"  {(peak - base) / above_first:20.2f}",
            flush=True,
        )


def main() -> None:
    """Print both tables, or measure the one map that the argument names."""
    if len(sys.argv) > 1:
        print(json.dumps(write_map(*json.loads(sys.argv[1]))))
        return
    print_sizes(2000)
    print_memory((100, 1000, 4000))


if __name__ == "__main__":
    main()
