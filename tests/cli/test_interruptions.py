"""A sweep that is stopped, killed or starved of disk goes on where it was."""

import shlex
import signal
import subprocess
import sys
from pathlib import Path

import h5py
import pytest
from numpy.testing import assert_array_equal

from tests.cli.conftest import LONG_SWEEP, STACK

NAME = "my slab"  # a name that a shell takes apart
CHILD = """
import os, resource, signal, sys
from slabsim.cli import main, progress
from slabsim.sweeps.progress import SilentProgress

class Killing(SilentProgress):
    def advance(self, points):
        os.kill(os.getpid(), signal.SIGKILL)

how, *sys.argv[1:] = sys.argv[1:]
if how == "kill":
    progress.bar = Killing
else:
    resource.setrlimit(resource.RLIMIT_FSIZE, (int(how), int(how)))
main()
"""


class Stopping:
    """A progress bar whose reader presses Ctrl-C after the first block."""

    def __init__(self):
        self.points = []

    def start(self, total_points, done_points):
        self.points.append(total_points - done_points)

    def advance(self, points):
        if len(self.points) == 1:
            signal.raise_signal(signal.SIGINT)
        self.points.append(points)

    def stop(self):
        pass


@pytest.fixture
def long_stack(folder):
    path = Path(f"{NAME}.toml")
    path.write_text(STACK + LONG_SWEEP)
    return path


@pytest.fixture
def whole(slabsim, long_stack):
    """Transmittance of the map of a run that nothing disturbs."""
    assert slabsim("sweep", long_stack, "-o", "whole.h5").code == 0
    with h5py.File("whole.h5") as file:
        return file["transmittance"][()]


def run_child(how, *arguments):
    command = [sys.executable, "-c", CHILD, how, *(str(argument) for argument in arguments)]
    return subprocess.run(command, capture_output=True, text=True, check=False)


def typed(message):
    """Arguments of the command that a message tells to type, as a shell reads them."""
    program, *arguments = shlex.split(message[message.index("slabsim sweep") :].splitlines()[0])
    assert program == "slabsim"
    return arguments


def done_blocks(path):
    with h5py.File(path) as file:
        return int((file["entry/progress/block_done"][()] == 1).sum())


def test_ctrl_c_prints_a_command_that_goes_on(slabsim, long_stack, whole, monkeypatch):
    with monkeypatch.context() as patch:
        patch.setattr("slabsim.cli.progress.bar", Stopping)
        ended = slabsim("sweep", long_stack)
    assert ended.code == 130
    assert ended.err.startswith("stopped; blocks 1 of 4 are safe")
    assert "Traceback" not in ended.err
    assert done_blocks(f"{NAME}.h5") == 1
    resumed = slabsim(*typed(ended.err))
    assert resumed.code == 0
    with h5py.File(f"{NAME}.h5") as file:
        assert_array_equal(file["transmittance"], whole)


def test_resumed_run_computes_only_what_is_left(slabsim, long_stack, monkeypatch):
    with monkeypatch.context() as patch:
        patch.setattr("slabsim.cli.progress.bar", Stopping)
        slabsim("sweep", long_stack)
    bar = Stopping()
    bar.points.append(0)  # no Ctrl-C this time
    monkeypatch.setattr("slabsim.cli.progress.bar", lambda: bar)
    assert slabsim("sweep", long_stack, "--resume").code == 0
    assert bar.points[1] == sum(bar.points[2:]) == 90_000  # of 400 by 300


def test_sweep_with_a_failed_block_ends_with_an_error_and_the_command_to_try_again(slabsim, stack, monkeypatch):
    def failing(*place):
        raise FloatingPointError("no solution")

    with monkeypatch.context() as patch:
        patch.setattr("slabsim.sweeps.run.engine_solver", lambda stack: failing)
        ended = slabsim("sweep", stack)
    assert ended.code == 1
    assert "FloatingPointError: no solution" in ended.out
    assert slabsim(*typed(ended.out)).code == 0


def test_killed_sweep_goes_on(slabsim, long_stack, whole):
    killed = run_child("kill", "sweep", long_stack, "-o", "killed.h5")
    assert killed.returncode == -signal.SIGKILL
    assert done_blocks("killed.h5") >= 1
    assert slabsim("sweep", long_stack, "-o", "killed.h5", "--resume").code == 0
    with h5py.File("killed.h5") as file:
        assert_array_equal(file["transmittance"], whole)


def test_unfinished_map_is_plotted_and_existing_one_names_the_command(slabsim, long_stack, monkeypatch):
    with monkeypatch.context() as patch:
        patch.setattr("slabsim.cli.progress.bar", Stopping)
        slabsim("sweep", long_stack)
    assert slabsim("plot", f"{NAME}.h5", "-o", "part.svg").code == 0
    assert Path("part.svg").read_text().rstrip().endswith("</svg>")
    assert slabsim("compare", f"{NAME}.h5", "--angle", 30).code == 0
    refused = slabsim("sweep", long_stack)
    assert refused.code == 1
    resumed = slabsim(*typed(refused.err))
    assert resumed.code == 0
    with h5py.File(f"{NAME}.h5") as file:
        assert file["entry/progress/state"][()].rstrip(b"\0") == b"complete"


def test_disk_that_fills_up_keeps_the_finished_blocks(slabsim, long_stack, whole):
    size = Path("whole.h5").stat().st_size
    starved = run_child(str(size * 6 // 10), "sweep", long_stack, "-o", "starved.h5")
    assert starved.returncode == 1
    assert "the disk is full" in starved.stderr
    assert "Traceback" not in starved.stderr
    assert 1 <= done_blocks("starved.h5") < 4
    assert slabsim(*typed(starved.stderr)).code == 0
    with h5py.File("starved.h5") as file:
        assert_array_equal(file["transmittance"], whole)


def test_full_disk_leaves_the_map_that_was_to_be_replaced(slabsim, map_file):
    before = map_file.read_bytes()
    starved = run_child("4000", "sweep", "slab.toml", "--replace")
    assert starved.returncode == 1
    assert "the disk is full" in starved.stderr
    assert "no map was made" in starved.stderr
    assert map_file.read_bytes() == before
    starved = run_child("4000", "compare", map_file)
    assert starved.returncode == 1
    assert map_file.read_bytes() == before
