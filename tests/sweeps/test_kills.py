"""Sweeps that are killed, interrupted, or run out of disk: finished blocks are safe, resumed maps equal whole ones."""

import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

from slabsim.errors import MapError
from slabsim.store import layout
from slabsim.store.reader import open_map
from slabsim.sweeps.run import run_sweep
from tests.store.demo import DemoSolver, contents, expected
from tests.sweeps.child import BLOCK, child_plan, child_stack

ROOT = Path(__file__).parents[2]


def start(*arguments):
    """A child whose first block is being computed."""
    process = subprocess.Popen(
        [sys.executable, "-m", "tests.sweeps.child", *map(str, arguments)],
        cwd=ROOT,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )
    assert process.stdout.readline() == "solving\n", process.communicate()
    return process


def flags_after_check(path, stack):
    """Flags of a map whose finished blocks have been compared with the exact values."""
    with open_map(path) as found:
        flags = found.flags
        is_done = np.kron(flags == layout.DONE, np.ones(BLOCK, dtype=bool))
        for name in found.quantities:
            for azimuth, of_azimuth in enumerate(expected(stack, name)):
                for polarization, values in zip(found.polarizations, of_azimuth, strict=True):
                    seen = found.read(name, polarization, azimuth)
                    np.testing.assert_array_equal(seen[is_done[azimuth]], values[is_done[azimuth]])
    return flags


def whole_map(path, stack):
    run_sweep(stack, path, DemoSolver(stack), plan=child_plan(stack))
    return contents(path)


def test_a_sweep_killed_again_and_again_ends_as_if_it_never_was(tmp_path):
    rng = np.random.default_rng(5)
    stack, path = child_stack(), tmp_path / "map.h5"
    n_done = 0
    for number in range(8):
        process = start(path, "--pause", 0.002, *(["--resume"] if number else []))
        time.sleep(rng.uniform(0.0, 0.06))
        process.kill()
        process.communicate()
        assert process.returncode == -signal.SIGKILL
        found = int(np.count_nonzero(flags_after_check(path, stack) == layout.DONE))
        assert found >= n_done
        n_done = found
    assert 0 < n_done < 120
    solver = DemoSolver(stack)
    report = run_sweep(stack, path, solver, resume=True)
    assert report.n_found == n_done
    assert len(solver.calls) == report.n_computed == 120 - n_done
    assert contents(path) == whole_map(tmp_path / "whole.h5", stack)


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_ctrl_c_ends_after_the_block_and_says_how_to_go_on(tmp_path, number):
    stack, path = child_stack(), tmp_path / "map.h5"
    process = start(path, "--pause", 0.02)
    process.send_signal(number)
    _, text = process.communicate()
    assert process.returncode == 1
    n_done = int(np.count_nonzero(flags_after_check(path, stack) == layout.DONE))
    assert 1 <= n_done < 120
    assert text == (
        f"SweepInterrupted: stopped; blocks {n_done} of 120 are safe in {path}; go on with: "
        f"slabsim sweep STACK --output {path} --resume\n"
    )
    solver = DemoSolver(stack)
    run_sweep(stack, path, solver, resume=True)
    assert len(solver.calls) == 120 - n_done
    assert contents(path) == whole_map(tmp_path / "whole.h5", stack)


@pytest.mark.skipif(sys.platform == "win32", reason="no limit on file size")
def test_a_full_disk_keeps_the_finished_blocks(tmp_path):
    stack, path = child_stack(), tmp_path / "map.h5"
    process = start(path, "--limit", 150_000)
    _, text = process.communicate()
    assert process.returncode == 1
    assert "MapError" in text
    assert "the finished blocks are safe; make room, then go on with: slabsim sweep STACK" in text
    n_done = int(np.count_nonzero(flags_after_check(path, stack) == layout.DONE))
    assert 0 < n_done < 120
    solver = DemoSolver(stack)
    run_sweep(stack, path, solver, resume=True)
    assert len(solver.calls) == 120 - n_done
    assert contents(path) == whole_map(tmp_path / "whole.h5", stack)


@pytest.mark.skipif(sys.platform == "win32", reason="no limit on file size")
def test_a_disk_too_full_to_start_leaves_no_file(tmp_path):
    process = subprocess.run(
        [sys.executable, "-m", "tests.sweeps.child", tmp_path / "map.h5", "--limit", "20000"],
        cwd=ROOT,
        capture_output=True,
        text=True,
    )
    assert process.returncode == 1
    assert "MapError" in process.stderr
    assert "no map was made" in process.stderr
    assert list(tmp_path.iterdir()) == []


def test_a_map_may_be_read_but_not_resumed_while_it_is_written(tmp_path):
    stack, path = child_stack(), tmp_path / "map.h5"
    process = start(path, "--pause", 0.05)
    try:
        flags_after_check(path, stack)
        with pytest.raises(MapError, match="another process is writing this map"):
            run_sweep(stack, path, DemoSolver(stack), resume=True)
        with pytest.raises(MapError, match="another process is writing this map"):
            run_sweep(stack, path, DemoSolver(stack), replace=True)
    finally:
        process.kill()
        process.communicate()
