"""How long does a user wait before anything happens?

    python benchmarks/start_up.py        (slabsim installed; about a minute, most of it one compilation)

Every line is a fresh interpreter, wall time, the best of several runs taken in turn; the first run of a solution
happens once, with an empty cache of compiled code.

Read the ratio to `import typer`, the least that a command line with help and completion costs: `--help` should
stay near 1, because commands import what computes inside their bodies. The ratios of the solver say what the first
number costs; the one of the first run is paid once after an installation or an upgrade.
"""

import os
import subprocess
import sys
import tempfile
import time

REPEATS = 7
BASELINE = "import typer"
SOLUTION = """
import numpy as np
from slabsim.engine.response import Solver
from slabsim.stack.reader import parse_stack
stack = parse_stack('''
[material.foam]
permittivity = 1.07
[material.copper]
conductivity = "5.8e7 S/m"
[[layer]]
name = "wire slab"
material = "foam"
thickness = "10 mm"
[[layer.wires]]
pitch = "2 mm"
radius = "50 um"
metal = "copper"
ends = ["open", "open"]
[sweep]
spectrum = "10 GHz"
angle = "30 deg"
''')
response = Solver(stack).solve(stack.sweep.frequencies, stack.sweep.angles_deg)
assert np.all(np.isfinite(response.r))
"""
COMMANDS = {
    "python, nothing imported": ("-c", "pass"),
    BASELINE: ("-c", BASELINE),
    "slabsim --help": ("-m", "slabsim", "--help"),
    "import the stack reader": ("-c", "import slabsim.stack.reader"),
    "import the solver": ("-c", "import slabsim.engine.response"),
    "read and solve one point": ("-c", SOLUTION),
}
FIRST = "the same, compiling"


def seconds(arguments: tuple[str, ...], cache: str) -> float:
    """Wall time of one interpreter [s]; a command that fails ends the benchmark."""
    start = time.perf_counter()
    done = subprocess.run(
        (sys.executable, *arguments),
        env=os.environ | {"NUMBA_CACHE_DIR": cache},
        stdout=subprocess.DEVNULL,
        stderr=subprocess.PIPE,
        text=True,
    )
    elapsed = time.perf_counter() - start
    if done.returncode:
        sys.exit(f"python {' '.join(arguments)} failed:\n{done.stderr}")
    return elapsed


def measure() -> dict[str, float]:
    """Best wall time of every command [s], and of the first solution."""
    with tempfile.TemporaryDirectory() as cache:
        first = seconds(COMMANDS["read and solve one point"], cache)
        rounds = [{name: seconds(command, cache) for name, command in COMMANDS.items()} for _ in range(REPEATS)]
    best = {name: min(times[name] for times in rounds) for name in COMMANDS}
    return best | {FIRST: first}


def main() -> None:
    """Print the table."""
    best = measure()
    print(f"{'best of ' + str(REPEATS) + ', compiling once':28s}       s   ratio")
    for name, time_taken in best.items():
        print(f"{name:28s}  {time_taken:6.3f}  {time_taken / best[BASELINE]:6.2f}")


if __name__ == "__main__":
    main()
