"""Running a sweep: from the pending blocks of a map to a complete map."""

from __future__ import annotations

import os
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Protocol

import numpy as np

from slabsim.errors import InputError, SlabsimError, SweepInterrupted
from slabsim.stack.sample import Stack
from slabsim.store.blocks import BlockResponse
from slabsim.store.reader import open_map
from slabsim.store.writer import MapWriter
from slabsim.sweeps.plan import SweepPlan
from slabsim.sweeps.progress import Progress, SilentProgress
from slabsim.sweeps.report import FailedBlock, SweepReport
from slabsim.sweeps.signals import StopRequest

_EDGE = 1e-12  # relative rounding of the onset of diffraction


class BlockSolver(Protocol):
    """Computes the response at frequencies [Hz] by angles [degrees], at one azimuth [degrees]."""

    def __call__(self, frequencies: np.ndarray, angles_deg: np.ndarray, azimuth_deg: float, /) -> BlockResponse: ...


@dataclass(frozen=True)
class Response:
    """The response of a block, arrays of shape (n_channels, n_freqs, n_angles), A (n_incident, n_freqs, n_angles)."""

    r: np.ndarray
    t: np.ndarray | None
    R: np.ndarray
    T: np.ndarray | None
    A: np.ndarray


def run_sweep(
    stack: Stack,
    path: str | os.PathLike[str],
    solve_block: BlockSolver | None = None,
    *,
    plan: SweepPlan | None = None,
    resume: bool = False,
    replace: bool = False,
    compress: bool = False,
    progress: Progress | None = None,
    stop: Callable[[], bool] | None = None,
) -> SweepReport:
    """Compute the sweep of a stack into a map, block by block; memory holds one block.

    A block whose solution raises `SlabsimError` or `ArithmeticError` is flagged failed and the run
    goes on. A response that is not finite is stored as NaN and named in the report.

    Parameters
    ----------
    stack : Stack
    path : path
        The map.
    solve_block : BlockSolver, optional
        Default: the engine.
    plan : SweepPlan, optional
        Default: blocks of about 32768 points; a resumed run keeps the blocks of the map.
    resume : bool
        Go on with an unfinished map; no finished block is computed again.
    replace : bool
        Replace an existing map.
    compress : bool
        Compress the map: 1.3 times smaller and much slower.
    progress : Progress, optional
    stop : callable, optional
        Asked after every block; true ends the run as Ctrl-C does.

    Returns
    -------
    SweepReport

    Raises
    ------
    MapError
        If the map cannot be made, continued or written; finished blocks are safe.
    SweepInterrupted
        After Ctrl-C, SIGTERM or `stop`; finished blocks are safe and the message says how to go on.
    """
    if resume and replace:
        raise InputError("resume and replace are both set; resume goes on with a map, replace throws it away")
    path = Path(path)
    if resume:
        plan, is_complete = _look_into(path, stack, plan)
        if is_complete:
            return SweepReport(path, plan.n_blocks, plan.n_points, n_found=plan.n_blocks)
    plan = plan or SweepPlan.of(stack.sweep)
    solve_block = solve_block or engine_solver(stack)
    if resume:
        writer = MapWriter.resume(path, stack, plan)
    else:
        writer = MapWriter.create(path, stack, plan, replace=replace, compress=compress)
    report = SweepReport(path, plan.n_blocks, plan.n_points)
    run = _Run(stack, plan, writer, solve_block, progress or SilentProgress(), report)
    return _watched(run, stop)


def engine_solver(stack: Stack) -> BlockSolver:
    """The engine as a block solver."""
    from slabsim.engine.response import Solver  # compiles: only when something is computed

    return Solver(stack, stack.sweep.model).solve


@dataclass
class _Run:
    stack: Stack
    plan: SweepPlan
    writer: MapWriter
    solve_block: BlockSolver
    progress: Progress
    report: SweepReport

    def compute(self, is_stopped: Callable[[], bool]) -> bool:
        """Compute what is not done; true if stopped with something left."""
        left = self.writer.unfinished_blocks()
        points_left = sum(self.plan.place(int(index)).n_points for index in left)
        self.report.n_found = self.plan.n_blocks - left.size
        self.progress.start(self.plan.n_points, self.plan.n_points - points_left)
        try:
            for twins in self._alike(left):
                if is_stopped():
                    return True
                self._compute_blocks(twins)
        finally:
            self.progress.stop()
        if self.report.is_complete:
            self.writer.finish()
        return False

    def _alike(self, left: np.ndarray) -> list[list[int]]:
        """Blocks with the same response: all azimuths at once, if the stack looks alike from all of them."""
        if self.stack.depends_on_azimuth:
            return [[int(index)] for index in left]
        n_azimuths = self.plan.block_counts[0]
        groups: dict[int, list[int]] = {}
        for index in left:
            groups.setdefault(int(index) % (self.plan.n_blocks // n_azimuths), []).append(int(index))
        return list(groups.values())

    def _compute_blocks(self, twins: list[int]) -> None:
        place = self.plan.place(twins[0])
        sweep = self.stack.sweep
        frequencies, angles_deg = sweep.frequencies[place.frequencies], sweep.angles_deg[place.angles]
        azimuth_deg = float(sweep.azimuths_deg[place.azimuth])
        try:
            response = self.solve_block(frequencies, angles_deg, azimuth_deg)
        except (SlabsimError, ArithmeticError) as error:
            reason = f"{type(error).__name__}: {error}"
            for index in twins:
                self.writer.mark_failed(index)
                self.report.failed.append(FailedBlock(index, _ends(frequencies), _ends(angles_deg), reason))
                self.progress.advance(place.n_points)
            return
        is_missing = _missing_incident(response)
        if np.any(is_missing):
            self._note_missing(is_missing, frequencies, angles_deg, twins)
            response = _blanked(response, is_missing)
        for index in twins:
            self.writer.write_block(index, response)
            self.report.n_computed += 1
            self.progress.advance(place.n_points)

    def _note_missing(
        self, is_missing: np.ndarray, frequencies: np.ndarray, angles_deg: np.ndarray, twins: list[int]
    ) -> None:
        from slabsim.engine.diffraction import onset

        sweep = self.stack.sweep
        for index in twins:
            azimuth_deg = float(sweep.azimuths_deg[self.plan.place(index).azimuth])
            lowest = onset(self.stack, angles_deg, azimuth_deg)
            beyond = is_missing & (frequencies[:, None] >= lowest * (1.0 - _EDGE))
            self.report.n_diffracting += int(np.count_nonzero(beyond))
            others = is_missing & ~beyond
            self.report.note_missing(others, sweep.polarizations, frequencies, angles_deg, azimuth_deg)


def _watched(run: _Run, stop: Callable[[], bool] | None) -> SweepReport:
    with StopRequest() as request:
        try:
            with run.writer:
                was_stopped = run.compute(lambda: request.is_set or (stop is not None and stop()))
        except KeyboardInterrupt as error:
            raise _interrupted(run.report) from error
    if was_stopped:
        raise _interrupted(run.report)
    return run.report


def _look_into(path: Path, stack: Stack, plan: SweepPlan | None) -> tuple[SweepPlan, bool]:
    with open_map(path) as found:
        found.check_same(stack)
        return plan or SweepPlan.of(stack.sweep, block_shape=found.block_shape), found.is_complete


def _interrupted(report: SweepReport) -> SweepInterrupted:
    return SweepInterrupted(
        f"stopped; blocks {report.n_done} of {report.n_blocks} are safe in {report.path}; go on with: "
        f"{report.resume_command}"
    )


def _missing_incident(response: BlockResponse) -> np.ndarray:
    """Where something is not finite, for each incident polarization: bool array, shape of A."""
    is_finite = np.isfinite(response.r) & np.isfinite(response.R)
    for transmitted in (response.t, response.T):
        if transmitted is not None:
            is_finite &= np.isfinite(transmitted)
    # the channels are the incident polarizations, then their cross terms in the same order
    by_incident = is_finite.reshape(-1, *response.A.shape).all(axis=0)
    return ~(by_incident & np.isfinite(response.A))


def _blanked(response: BlockResponse, missing_incident: np.ndarray) -> Response:
    is_missing = np.tile(missing_incident, (response.r.shape[0] // missing_incident.shape[0], 1, 1))
    t = None if response.t is None else np.where(is_missing, complex(np.nan, np.nan), response.t)
    T = None if response.T is None else np.where(is_missing, np.nan, response.T)
    return Response(
        np.where(is_missing, complex(np.nan, np.nan), response.r),
        t,
        np.where(is_missing, np.nan, response.R),
        T,
        np.where(missing_incident, np.nan, response.A),
    )


def _ends(values: np.ndarray) -> tuple[float, float]:
    return float(values[0]), float(values[-1])
