"""How a sweep is cut into blocks: the unit of computing, writing and resuming."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Self

from slabsim.errors import InputError
from slabsim.stack.sample import Sweep
from slabsim.store.blocks import Place

POINTS_PER_BLOCK = 32768  # 256 KiB per quantity and polarization: fits the chunk cache, keeps flushes rare


@dataclass(frozen=True)
class SweepPlan:
    """A sweep cut into blocks, counted with the angle running fastest, then frequency, then azimuth.

    Parameters
    ----------
    grid_shape : tuple of int
        Number of azimuths, frequencies, angles.
    block_shape : tuple of int
        Frequencies and angles of a full block; the last ones along an axis may be smaller.

    Raises
    ------
    InputError
        If a number is less than 1.
    """

    grid_shape: tuple[int, int, int]
    block_shape: tuple[int, int]

    def __post_init__(self) -> None:
        if min(*self.grid_shape, *self.block_shape) < 1:
            raise InputError(
                f"a grid of {self.grid_shape} points in blocks of {self.block_shape}; every number must be at least 1"
            )

    @classmethod
    def of(
        cls,
        sweep: Sweep,
        *,
        points_per_block: int = POINTS_PER_BLOCK,
        block_shape: tuple[int, int] | None = None,
    ) -> Self:
        """Plan of a sweep.

        Parameters
        ----------
        sweep : Sweep
        points_per_block : int
            At most so many points a block; whole rows of angles where they fit.
        block_shape : tuple of int, optional
            Frequencies and angles of a block, instead of `points_per_block`.
        """
        grid = (sweep.azimuths_deg.size, sweep.frequencies.size, sweep.angles_deg.size)
        if block_shape is None:
            n_angles = _even_part(grid[2], points_per_block)
            block_shape = (_even_part(grid[1], points_per_block // n_angles), n_angles)
        return cls(grid, (min(block_shape[0], grid[1]), min(block_shape[1], grid[2])))

    @property
    def block_counts(self) -> tuple[int, int, int]:
        """Number of blocks along azimuth, frequency and angle."""
        n_azimuths, n_freqs, n_angles = self.grid_shape
        return n_azimuths, -(-n_freqs // self.block_shape[0]), -(-n_angles // self.block_shape[1])

    @property
    def n_blocks(self) -> int:
        """Number of blocks."""
        n_azimuths, along_frequency, along_angle = self.block_counts
        return n_azimuths * along_frequency * along_angle

    @property
    def n_points(self) -> int:
        """Number of grid points; both polarizations of a point count once."""
        n_azimuths, n_freqs, n_angles = self.grid_shape
        return n_azimuths * n_freqs * n_angles

    def place(self, index: int) -> Place:
        """Where block `index` lies.

        Raises
        ------
        InputError
            If there is no such block.
        """
        if not 0 <= index < self.n_blocks:
            raise InputError(f"block {index}; the sweep has blocks 0 to {self.n_blocks - 1}")
        _, along_frequency, along_angle = self.block_counts
        rest, column = divmod(index, along_angle)
        azimuth, row = divmod(rest, along_frequency)
        return Place(
            azimuth,
            _part(row, self.block_shape[0], self.grid_shape[1]),
            _part(column, self.block_shape[1], self.grid_shape[2]),
        )


def _even_part(n: int, at_most: int) -> int:
    # chunks at the far edge are stored in full size: nearly equal parts waste least
    n_parts = -(-n // max(at_most, 1))
    return -(-n // n_parts)


def _part(number: int, size: int, n: int) -> slice:
    return slice(number * size, min((number + 1) * size, n))
