"""What a run did: the points without a value, the blocks that failed, whether the map is complete."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from slabsim.store.failures import RESUME_CURE

LISTED = 10  # points named one by one; the others are only counted


@dataclass(frozen=True)
class MissingPoint:
    """A point where no finite response was found; its values in the map are NaN."""

    frequency: float
    angle_deg: float
    azimuth_deg: float
    polarization: str

    def __str__(self) -> str:
        return (
            f"{self.polarization} at {self.frequency:.10g} Hz, {self.angle_deg:g} deg, azimuth {self.azimuth_deg:g} deg"
        )


@dataclass(frozen=True)
class FailedBlock:
    """A block that could not be computed: its range and the reason."""

    index: int
    frequencies: tuple[float, float]
    angles_deg: tuple[float, float]
    reason: str

    def __str__(self) -> str:
        (f_low, f_high), (low, high) = self.frequencies, self.angles_deg
        return f"block {self.index} ({f_low:.6g} to {f_high:.6g} Hz, {low:g} to {high:g} deg): {self.reason}"


@dataclass
class SweepReport:
    """What a run did.

    Parameters
    ----------
    path : Path
        The map.
    n_blocks, n_points : int
        Of the whole sweep.
    n_found : int
        Blocks that were done before this run.
    n_computed : int
        Blocks computed by this run.
    n_missing : int
        Responses of this run that are not finite, NaN in the map.
    n_diffracting : int
        Responses of this run beyond the onset of diffraction of a grid or of plates, NaN in the map.
    missing : list of MissingPoint
        The first of them.
    failed : list of FailedBlock
        Blocks of this run that could not be computed; a resumed run tries them again.
    """

    path: Path
    n_blocks: int
    n_points: int
    n_found: int = 0
    n_computed: int = 0
    n_missing: int = 0
    n_diffracting: int = 0
    missing: list[MissingPoint] = field(default_factory=list)
    failed: list[FailedBlock] = field(default_factory=list)

    @property
    def n_done(self) -> int:
        """Blocks that are in the map."""
        return self.n_found + self.n_computed

    @property
    def is_complete(self) -> bool:
        """Whether every block is in the map."""
        return self.n_done == self.n_blocks

    @property
    def resume_command(self) -> str:
        """What to type to go on."""
        return RESUME_CURE.format(path=self.path)

    def note_missing(
        self,
        is_missing: np.ndarray,
        polarizations: tuple[str, ...],
        frequencies: np.ndarray,
        angles_deg: np.ndarray,
        azimuth_deg: float,
    ) -> None:
        """Count the true entries of a mask, shape (n_polarizations, n_freqs, n_angles), and name the first."""
        self.n_missing += int(np.count_nonzero(is_missing))
        for row, i, j in np.argwhere(is_missing)[: LISTED - len(self.missing)]:
            point = (float(frequencies[i]), float(angles_deg[j]), azimuth_deg, polarizations[row])
            self.missing.append(MissingPoint(*point))

    def __str__(self) -> str:
        if self.is_complete and not self.n_computed:
            return f"{self.path}: the map is complete; nothing is left to compute"
        lines = [f"{self.path}: {self.n_done} of {self.n_blocks} blocks are done"]
        if self.n_diffracting:
            lines.append(
                f"{self.n_diffracting} responses lie beyond the onset of diffraction of a grid or of plates and are "
                "NaN in the map: power goes into other directions there"
            )
        if self.n_missing:
            lines.append(f"{self.n_missing} responses are not finite and are NaN in the map:")
            lines += [f"  {point}" for point in self.missing]
            lines += ["  ..."] if self.n_missing > len(self.missing) else []
        if self.failed:
            blocks = "1 block" if len(self.failed) == 1 else f"{len(self.failed)} blocks"
            lines.append(f"{blocks} failed; try again with: {self.resume_command}")
            lines += [f"  {block}" for block in self.failed[:LISTED]]
        return "\n".join(lines)
