"""Running a sweep into a map."""

import signal
import threading
import tracemalloc
from dataclasses import replace

import numpy as np
import pytest

from slabsim.errors import InputError, MapError, MaterialError, SweepInterrupted
from slabsim.store.reader import open_map
from slabsim.sweeps.plan import SweepPlan
from slabsim.sweeps.run import run_sweep
from tests.store.demo import DemoSolver, contents, demo_plan, demo_stack, expected

SIGNALS = (signal.SIGINT, signal.SIGTERM)


@pytest.fixture
def path(tmp_path):
    return tmp_path / "map.h5"


class Spoiler(DemoSolver):
    """The demo solver, with something else happening in block `at` (counted from 1)."""

    def __init__(self, stack, at, happening):
        super().__init__(stack)
        self.at, self.happening = at, happening

    def __call__(self, *place):
        answer = super().__call__(*place)
        if len(self.calls) == self.at:
            self.happening(answer)
        return answer


class Listener:
    """Progress that remembers what it was told."""

    def __init__(self):
        self.told = []

    def start(self, total_points, done_points):
        self.told.append(("start", total_points, done_points))

    def advance(self, points):
        self.told.append(points)

    def stop(self):
        self.told.append("stop")


def raise_error(error):
    def happening(answer):
        raise error

    return happening


@pytest.mark.parametrize("options", [{}, {"back": None}, {"polarizations": ("TM",)}, {"store": ("power",)}])
def test_a_map_holds_what_the_solver_answered(path, options):
    stack = demo_stack(n_azimuths=2, **options)
    report = run_sweep(stack, path, DemoSolver(stack), plan=demo_plan(stack))
    assert (report.n_computed, report.n_found, report.n_blocks) == (12, 0, 12)
    assert report.is_complete
    assert str(report) == f"{path}: 12 of 12 blocks are done"
    with open_map(path) as found:
        assert found.is_complete
        for name in found.quantities:
            for azimuth in (0, 1):
                for row, polarization in enumerate(found.polarizations):
                    np.testing.assert_array_equal(
                        found.read(name, polarization, azimuth), expected(stack, name)[azimuth, row]
                    )


def test_a_complete_map_is_left_alone_by_a_resumed_run(path):
    stack = demo_stack()
    run_sweep(stack, path, DemoSolver(stack))
    before = path.read_bytes()
    solver = DemoSolver(stack)
    report = run_sweep(stack, path, solver, resume=True)
    assert str(report) == f"{path}: the map is complete; nothing is left to compute"
    assert report.is_complete
    assert solver.calls == []
    assert path.read_bytes() == before


def test_a_complete_map_of_another_stack_is_not_called_complete(path):
    stack = demo_stack()
    run_sweep(stack, path, DemoSolver(stack))
    other = demo_stack(model="local")
    with pytest.raises(MapError, match="belongs to another computation: model"):
        run_sweep(other, path, DemoSolver(other), resume=True)


def test_a_resumed_run_computes_no_finished_block_again(path, tmp_path):
    stack = demo_stack()
    plan = demo_plan(stack)
    first, second = DemoSolver(stack), DemoSolver(stack)
    with pytest.raises(SweepInterrupted, match=r"blocks 2 of 6 are safe in .*map\.h5; go on with: .*map\.h5 --resume"):
        run_sweep(stack, path, first, plan=plan, stop=lambda: len(first.calls) == 2)
    report = run_sweep(stack, path, second, resume=True)
    assert (report.n_found, report.n_computed) == (2, 4)
    assert sorted(first.calls + second.calls) == sorted(set(first.calls + second.calls))
    whole = tmp_path / "whole.h5"
    run_sweep(stack, whole, DemoSolver(stack), plan=plan)
    assert contents(path) == contents(whole)


def test_points_without_a_finite_response_are_nan_counted_and_named(path):
    stack = demo_stack()

    def spoil(answer):
        answer.t[1, 2, 1] = np.inf
        answer.R[0, 0, 0] = np.nan

    report = run_sweep(stack, path, Spoiler(stack, 3, spoil), plan=demo_plan(stack))
    assert report.n_missing == 2
    named = [(point.frequency, point.angle_deg, point.azimuth_deg, point.polarization) for point in report.missing]
    frequencies, angles_deg = stack.sweep.frequencies, stack.sweep.angles_deg
    assert named == [(frequencies[5], angles_deg[0], 0.0, "TE"), (frequencies[7], angles_deg[1], 0.0, "TM")]
    assert "2 responses are not finite and are NaN in the map:\n  TE at 2.090909091e+10 Hz, 0 deg" in str(report)
    with open_map(path) as found:
        assert found.is_complete
        for name in found.quantities:
            for row, polarization in enumerate(("TE", "TM")):
                values = expected(stack, name)[0, row]
                values[(5, 0) if polarization == "TE" else (7, 1)] = np.nan
                np.testing.assert_array_equal(found.read(name, polarization), values)


def test_only_the_first_missing_points_are_named(path):
    stack = demo_stack()
    report = run_sweep(stack, path, Spoiler(stack, 1, lambda answer: answer.A.fill(np.nan)), plan=demo_plan(stack))
    assert report.n_missing == 30
    assert len(report.missing) == 10
    assert str(report).endswith("...")


@pytest.mark.parametrize("error", [MaterialError("glass ends at 20 GHz"), ZeroDivisionError("division by zero")])
def test_a_block_that_cannot_be_solved_is_flagged_and_tried_again_later(path, error):
    stack = demo_stack()
    report = run_sweep(stack, path, Spoiler(stack, 2, raise_error(error)), plan=demo_plan(stack))
    assert not report.is_complete
    assert [block.index for block in report.failed] == [1]
    assert f"1 block failed; try again with: slabsim sweep STACK --output {path} --resume" in str(report)
    assert f"block 1 (5e+09 to 1.77273e+10 Hz, 60 to 80 deg): {type(error).__name__}: {error}" in str(report)
    with open_map(path) as found:
        assert found.block_states == {"pending": 0, "done": 5, "failed": 1}
        assert not found.is_complete
        assert np.all(np.isnan(found.read("transmittance", "TM", 0, slice(0, 5), slice(3, 5))))
    solver = DemoSolver(stack)
    assert run_sweep(stack, path, solver, resume=True).is_complete
    assert len(solver.calls) == 1


def test_a_mistake_in_the_solver_is_not_swallowed(path):
    stack = demo_stack()
    with pytest.raises(TypeError, match="a mistake"):
        run_sweep(stack, path, Spoiler(stack, 3, raise_error(TypeError("a mistake"))), plan=demo_plan(stack))
    with open_map(path) as found:
        assert found.block_states == {"pending": 4, "done": 2, "failed": 0}


@pytest.mark.parametrize("number", SIGNALS)
def test_the_first_signal_lets_the_block_finish(path, number):
    stack = demo_stack()
    handlers = [signal.getsignal(each) for each in SIGNALS]
    solver = Spoiler(stack, 3, lambda answer: signal.raise_signal(number))
    with pytest.raises(SweepInterrupted, match="blocks 3 of 6 are safe"):
        run_sweep(stack, path, solver, plan=demo_plan(stack))
    assert [signal.getsignal(each) for each in SIGNALS] == handlers
    with open_map(path) as found:
        assert found.block_states["done"] == 3


def test_the_second_ctrl_c_ends_at_once(path):
    stack = demo_stack()

    def press_twice(answer):
        signal.raise_signal(signal.SIGINT)
        signal.raise_signal(signal.SIGINT)

    with pytest.raises(SweepInterrupted, match="blocks 2 of 6 are safe"):
        run_sweep(stack, path, Spoiler(stack, 3, press_twice), plan=demo_plan(stack))
    with open_map(path) as found:
        assert found.block_states["done"] == 2
    assert run_sweep(stack, path, DemoSolver(stack), resume=True).is_complete


def test_a_signal_in_the_last_block_completes_the_map(path):
    stack = demo_stack()
    solver = Spoiler(stack, 6, lambda answer: signal.raise_signal(signal.SIGINT))
    assert run_sweep(stack, path, solver, plan=demo_plan(stack)).is_complete


def test_an_ignored_signal_stays_ignored(path):
    stack = demo_stack()
    previous = signal.signal(signal.SIGINT, signal.SIG_IGN)
    try:
        solver = Spoiler(stack, 2, lambda answer: signal.raise_signal(signal.SIGINT))
        assert run_sweep(stack, path, solver, plan=demo_plan(stack)).is_complete
        assert signal.getsignal(signal.SIGINT) == signal.SIG_IGN
    finally:
        signal.signal(signal.SIGINT, previous)


def test_a_sweep_in_another_thread_leaves_the_signals_alone(path):
    stack = demo_stack()
    reports, seen = [], []
    handlers = [signal.getsignal(each) for each in SIGNALS]
    solver = Spoiler(stack, 2, lambda answer: seen.extend(signal.getsignal(each) for each in SIGNALS))
    thread = threading.Thread(target=lambda: reports.append(run_sweep(stack, path, solver, plan=demo_plan(stack))))
    thread.start()
    thread.join()
    assert reports[0].is_complete
    assert seen == handlers


def test_progress_is_told_in_points(path):
    stack = demo_stack()
    plan = demo_plan(stack)
    listener, solver = Listener(), DemoSolver(stack)
    with pytest.raises(SweepInterrupted):
        run_sweep(stack, path, solver, plan=plan, progress=listener, stop=lambda: len(solver.calls) == 2)
    assert listener.told == [("start", 60, 0), 15, 10, "stop"]
    listener = Listener()
    run_sweep(stack, path, DemoSolver(stack), resume=True, progress=listener)
    assert listener.told == [("start", 60, 25), 15, 10, 6, 4, "stop"]


def test_an_existing_map_is_refused_replaced_or_resumed(path):
    stack = demo_stack()
    run_sweep(stack, path, DemoSolver(stack))
    before = path.read_bytes()
    with pytest.raises(MapError, match="there is a file already"):
        run_sweep(stack, path, DemoSolver(stack))
    with pytest.raises(InputError, match="resume and replace are both set"):
        run_sweep(stack, path, DemoSolver(stack), resume=True, replace=True)
    assert path.read_bytes() == before
    other = demo_stack(model="local")
    run_sweep(other, path, DemoSolver(other), replace=True)
    with open_map(path) as found:
        assert found.model == "local"


def test_a_solver_that_cannot_be_made_leaves_no_map(path, monkeypatch):
    def fail(stack):
        raise InputError("no such model")

    monkeypatch.setattr("slabsim.sweeps.run.engine_solver", fail)
    with pytest.raises(InputError, match="no such model"):
        run_sweep(demo_stack(), path)
    assert not path.exists()


def test_a_compressed_map_is_resumed_compressed(path):
    stack = demo_stack()
    solver = DemoSolver(stack)
    with pytest.raises(SweepInterrupted):
        run_sweep(stack, path, solver, plan=demo_plan(stack), compress=True, stop=lambda: len(solver.calls) == 2)
    assert run_sweep(stack, path, DemoSolver(stack), resume=True).is_complete
    with open_map(path) as found:
        np.testing.assert_array_equal(found.read("t_imag", "TM"), expected(stack, "t_imag")[0, 1])


def test_memory_does_not_grow_with_the_sweep(tmp_path):
    peaks = []
    for n_freqs in (200, 2000):
        stack = demo_stack(n_freqs, 100)
        plan = SweepPlan.of(stack.sweep, block_shape=(50, 100))
        tracemalloc.start()
        run_sweep(stack, tmp_path / f"{n_freqs}.h5", DemoSolver(stack), plan=plan)
        peaks.append(tracemalloc.get_traced_memory()[1])
        tracemalloc.stop()
    whole = 2000 * 100 * 2 * 7 * 8  # bytes of the larger sweep's quantities
    assert peaks[1] < 1.5 * peaks[0] < whole / 5


def test_a_stack_that_looks_alike_from_all_sides_is_solved_once_for_all_azimuths(path):
    turning = demo_stack(n_azimuths=2)  # with plates
    alike = replace(turning, elements=turning.elements[:1])
    assert turning.depends_on_azimuth
    assert not alike.depends_on_azimuth
    for stack, n_calls in ((turning, 2), (alike, 1)):
        plan = SweepPlan.of(stack.sweep)
        solver = DemoSolver(stack)
        report = run_sweep(stack, path, solver, plan=plan, replace=True)
        assert report.n_computed == report.n_blocks == 2
        assert len(solver.calls) == n_calls
    with open_map(path) as found:
        assert found.is_complete
        assert np.array_equal(found.read("transmittance", "TM", 0), found.read("transmittance", "TM", 1))
