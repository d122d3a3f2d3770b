"""The writer of a map: block by block, so that a run may end at any moment and be resumed."""

from __future__ import annotations

import os
from contextlib import suppress
from pathlib import Path
from types import TracebackType
from typing import TYPE_CHECKING, Self

import numpy as np

from slabsim.errors import InputError, MapError
from slabsim.store import layout
from slabsim.store.creation import (
    OBJECTS_V110,
    block_size,
    build,
    empty_size,
    full_size,
    timestamp,
)
from slabsim.store.failures import (
    RESUME_CURE,
    failures_explained,
    has_signature,
    is_held,
    open_file,
)
from slabsim.store.provenance import Provenance
from slabsim.store.reader import open_map
from slabsim.store.recovery import is_sound, rebuild
from slabsim.store.room import allocation_end, check_room, reserve, trim

if TYPE_CHECKING:
    from slabsim.stack.sample import Stack
    from slabsim.store.blocks import BlockResponse, Plan


class MapWriter:
    """A map open for writing; a context manager.

    Made by `create` or `resume`. Whatever ends the run, the blocks written so far are safe.
    """

    def __init__(self, path: Path, stack: Stack, plan: Plan) -> None:
        self.path = path
        self._plan = plan
        self._quantities = layout.quantities(stack)
        self._n_rows = {"polarization": len(stack.channels), "incident": len(stack.sweep.polarizations)}
        shown = layout.plotted(stack)
        self._copies = [
            (layout.plot_name(shown, polarization), shown, row) for row, polarization in enumerate(stack.channels)
        ]
        self._block_size = block_size(stack, plan)
        self._file = open_file(path, "r+", libver=OBJECTS_V110)
        with failures_explained(path, "opened"):
            self._raw = path.open("r+b", buffering=0)  # the same file, for its size alone

    @classmethod
    def create(
        cls,
        path: str | os.PathLike[str],
        stack: Stack,
        plan: Plan,
        provenance: Provenance | None = None,
        *,
        replace: bool = False,
        compress: bool = False,
    ) -> Self:
        """Start a new map with every block pending.

        Parameters
        ----------
        path : path
            Where the map goes; it appears there complete in layout, or not at all.
        stack, plan
            The stack and how its sweep is cut into blocks.
        provenance : Provenance, optional
            What produces the numbers; default: this program, here and now.
        replace : bool
            Whether an existing map may be replaced.
        compress : bool
            Whether to compress (shuffle, gzip 1): 1.3 times smaller and much slower.

        Raises
        ------
        MapError
            If there is a file already, the folder is missing or read-only, or room is short.
        """
        target = Path(path).resolve()
        _check_target(target, replace)
        released = target.stat().st_size if target.exists() else 0
        check_room(target, full_size(stack, plan), released=released)
        unfinished = _unfinished(target)
        try:
            with failures_explained(target, "created"):
                with unfinished.open("wb") as raw:
                    reserve(raw, 0, empty_size(stack, plan))
                build(unfinished, stack, plan, provenance or Provenance.of(stack), compress=compress)
                os.replace(unfinished, target)
        finally:
            with suppress(OSError):
                unfinished.unlink()
        return cls(target, stack, plan)

    @classmethod
    def resume(cls, path: str | os.PathLike[str], stack: Stack, plan: Plan) -> Self:
        """Go on with a map that was left unfinished.

        Raises
        ------
        MapError
            If it is no map of this format, belongs to another stack or grid, is complete, or is
            being written by another process.
        """
        target = Path(path).resolve()
        with open_map(target) as found:
            found.check_same(stack)
            if found.is_complete:
                raise MapError(f"{target}: the map is complete; nothing is left to compute")
            if found.block_shape != plan.block_shape:
                raise MapError(
                    f"{target}: the map has blocks of {found.block_shape} frequencies and angles, the plan "
                    f"{plan.block_shape}; make the plan with the block shape of the map"
                )
        with failures_explained(target, "read"), target.open("rb") as raw:
            end = allocation_end(raw)
        writer = cls(target, stack, plan)
        with failures_explained(target, "resumed"):
            if is_sound(writer._file, end):
                return writer
            writer.close()
            return cls._rebuilt(target, stack, plan)

    @classmethod
    def _rebuilt(cls, target: Path, stack: Stack, plan: Plan) -> Self:
        unfinished = _unfinished(target)
        check_room(target, target.stat().st_size)
        try:
            rebuild(target, unfinished, stack, plan)
            os.replace(unfinished, target)
        finally:
            with suppress(OSError):
                unfinished.unlink()
        return cls(target, stack, plan)

    @property
    def flags(self) -> np.ndarray:
        """Flag of every block: uint8 array, shape ``plan.block_counts``; 0 pending, 1 done, 2 failed."""
        with failures_explained(self.path, "read"):
            return self._file[layout.BLOCK_DONE][()]

    def unfinished_blocks(self) -> np.ndarray:
        """Indices of the pending and the failed blocks, ascending."""
        return np.flatnonzero(self.flags != layout.DONE)

    def write_block(self, index: int, block: BlockResponse) -> None:
        """Write one block and flag it done.

        Raises
        ------
        MapError
            If the disk is full or fails; the blocks before this one are safe.
        InputError
            If an array of the block has another shape than its place in the grid.
        """
        place = self._plan.place(index)
        values = {
            quantity.name: _checked(quantity, block, index, (self._n_rows[quantity.axes[1]], *place.shape))
            for quantity in self._quantities
        }
        with failures_explained(self.path, "written"):
            reserve(self._raw, allocation_end(self._raw), self._block_size)
            data = self._file[layout.DATA]
            for name, array in values.items():
                data[name][place.azimuth, :, place.frequencies, place.angles] = array
            if place.azimuth == 0:
                for name, quantity, row in self._copies:
                    self._file[layout.PLOT][name][place.frequencies, place.angles] = quantity.of(block)[row]
            self._file.flush()  # the data must be on file before the flag says so
            self._flag(index, layout.DONE)

    def mark_failed(self, index: int) -> None:
        """Flag a block as failed; a resumed run tries it again."""
        with failures_explained(self.path, "written"):
            self._flag(index, layout.FAILED)

    def finish(self) -> None:
        """Declare the map complete.

        Raises
        ------
        MapError
            If blocks are pending or failed.
        """
        if left := self.unfinished_blocks().size:
            cure = RESUME_CURE.format(path=self.path)
            raise MapError(f"{self.path}: {left} blocks are not done yet; compute them with: {cure}")
        with failures_explained(self.path, "written"):
            self._file[f"{layout.ENTRY}/end_time"][()] = timestamp().encode()
            self._file.flush()
            self._file[layout.STATE][()] = layout.COMPLETE.encode()
            self._file.flush()

    def close(self) -> None:
        """Close the file; closing twice does no harm."""
        if not self._file:
            return
        with failures_explained(self.path, "closed"), self._raw:
            self._file.flush()
            trim(self._raw)
            self._file.close()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if error is None:
            self.close()
        else:  # the first error is the one to report
            with suppress(MapError):
                self.close()

    def _flag(self, index: int, flag: int) -> None:
        self._file[layout.BLOCK_DONE][np.unravel_index(index, self._plan.block_counts)] = flag
        self._file.flush()


def _unfinished(target: Path) -> Path:
    return target.with_name(f".{target.name}.new")


def _checked(quantity: layout.Quantity, block: BlockResponse, index: int, shape: tuple[int, int, int]) -> np.ndarray:
    array = quantity.of(block)
    if array.shape != shape:
        raise InputError(f"block {index}: {quantity.name} has shape {array.shape}; it must have {shape}")
    return array


def _check_target(target: Path, replace: bool) -> None:
    if target.is_dir():
        raise MapError(f"{target}: this is a folder; give the path of a file, for example {target / 'map.h5'}")
    if not target.parent.is_dir():
        what = "is a file, not a folder" if target.parent.exists() else "does not exist; make it first"
        raise MapError(f"{target}: the folder {target.parent} {what}")
    if not target.exists():
        return
    if not replace:
        raise MapError(
            f"{target}: there is a file already; choose another path, or --replace it, or go on with an "
            f"unfinished map: {RESUME_CURE.format(path=target)}"
        )
    if not has_signature(target):
        raise MapError(f"{target}: this file is no map, so it is not replaced; choose another path")
    if is_held(target):
        raise MapError(f"{target}: another process is writing this map; stop it, or choose another path")
