"""What the store asks of a block: its place in the grid, and the numbers found there."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Protocol

if TYPE_CHECKING:
    import numpy as np


@dataclass(frozen=True)
class Place:
    """Where a block lies in the grid: one azimuth, a run of frequencies, a run of angles."""

    azimuth: int
    frequencies: slice
    angles: slice

    @property
    def shape(self) -> tuple[int, int]:
        """Number of frequencies and of angles."""
        return (
            self.frequencies.stop - self.frequencies.start,
            self.angles.stop - self.angles.start,
        )

    @property
    def n_points(self) -> int:
        """Grid points of the block; both polarizations of a point count once."""
        return self.shape[0] * self.shape[1]


class BlockResponse(Protocol):
    """The response at the points of one block; arrays of shape (n_channels, n_freqs, n_angles).

    1. `r`, `t`: complex amplitudes; `t` is None in front of a perfect conductor.
    2. `R`, `T`, `A`: shares reflected, transmitted, absorbed; `T` is None where `t` is, and `A` has one row for each
       incident polarization.
    """

    @property
    def r(self) -> np.ndarray: ...
    @property
    def t(self) -> np.ndarray | None: ...
    @property
    def R(self) -> np.ndarray: ...  # noqa: N802
    @property
    def T(self) -> np.ndarray | None: ...  # noqa: N802
    @property
    def A(self) -> np.ndarray: ...  # noqa: N802


class Plan(Protocol):
    """How a sweep is cut into blocks.

    1. `block_shape`: frequencies and angles of a full block; the chunk shape of the file.
    2. `block_counts`: blocks along azimuth, frequency and angle; the shape of the flags in the file.
    3. `place(index)`: where block `index` lies, counted along the last axis of `block_counts` first.
    """

    @property
    def block_shape(self) -> tuple[int, int]: ...
    @property
    def block_counts(self) -> tuple[int, int, int]: ...
    def place(self, index: int) -> Place: ...
