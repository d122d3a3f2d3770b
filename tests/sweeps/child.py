"""A sweep in a process of its own, to be killed, interrupted or starved of disk.

    python -m tests.sweeps.child MAP [--resume] [--pause SECONDS] [--limit BYTES]

Says "solving" once the first block is being computed. Ends like the command line: 1 on an error, with its text.
"""

import argparse
import sys
import time

from slabsim.errors import SlabsimError
from slabsim.sweeps.plan import SweepPlan
from slabsim.sweeps.run import run_sweep
from tests.store.demo import DemoSolver, demo_stack

SHAPE = (40, 30, 2)
BLOCK = (4, 5)


class PausingSolver(DemoSolver):
    """The demo solver with a pause in every block."""

    def __init__(self, stack, pause):
        super().__init__(stack)
        self.pause = pause

    def __call__(self, *place):
        if not self.calls:
            print("solving", flush=True)
        time.sleep(self.pause)
        return super().__call__(*place)


def child_stack():
    """The stack of the child, 120 blocks."""
    return demo_stack(*SHAPE)


def child_plan(stack):
    """Its plan."""
    return SweepPlan.of(stack.sweep, block_shape=BLOCK)


def main():
    """Run the sweep."""
    parser = argparse.ArgumentParser()
    parser.add_argument("map")
    parser.add_argument("--resume", action="store_true")
    parser.add_argument("--pause", type=float, default=0.0)
    parser.add_argument("--limit", type=int)
    options = parser.parse_args()
    if options.limit:
        import resource

        resource.setrlimit(resource.RLIMIT_FSIZE, (options.limit, options.limit))
    stack = child_stack()
    solve = PausingSolver(stack, options.pause)
    plan = None if options.resume else child_plan(stack)
    try:
        print(run_sweep(stack, options.map, solve, plan=plan, resume=options.resume))
    except SlabsimError as error:
        sys.exit(f"{type(error).__name__}: {error}")


if __name__ == "__main__":
    main()
