"""Room on the disk, made sure of before HDF5 needs it.

HDF5 does not survive a write that does not fit: the superblock may already claim space that the file
never got, and then the whole file is refused. So the space of a block is reserved first, where a
full disk, a quota or a limit on file size does no harm.
"""

from __future__ import annotations

import errno
import os
import shutil
from pathlib import Path
from typing import BinaryIO

from slabsim.errors import MapError
from slabsim.store.failures import failures_explained

_END_AT = 28  # of the end-of-file address in superblock version 2


def check_room(target: Path, needed: int, *, released: int = 0) -> None:
    """Raise `MapError` if `needed` bytes do not fit on the disk once `released` bytes are given back."""
    with failures_explained(target, "created"):
        free = shutil.disk_usage(target.parent).free + released
    if free < needed:
        raise MapError(
            f"{target}: {needed / 1e6:.1f} MB are needed and {free / 1e6:.1f} MB are free; make room, use fewer "
            'points, or leave the amplitudes out: store = ["power"]'
        )


def allocation_end(file: BinaryIO) -> int:
    """End of the allocated space according to the superblock of a flushed map [bytes].

    Notes
    -----
    HDF5 file format specification, section II.A, superblock version 2: the end-of-file address is
    the third of the 8-byte addresses that follow the first 12 bytes.
    """
    file.seek(_END_AT)
    return int.from_bytes(file.read(8), "little")


def reserve(file: BinaryIO, start: int, n_bytes: int) -> None:
    """Make the disk hold `n_bytes` more from `start` on; OSError if it does not."""
    if hasattr(os, "posix_fallocate"):
        os.posix_fallocate(file.fileno(), start, n_bytes)
    elif (free := shutil.disk_usage(Path(file.name).parent).free) < n_bytes:
        raise OSError(errno.ENOSPC, f"{n_bytes / 1e6:.1f} MB needed, {free / 1e6:.1f} MB free")


def trim(file: BinaryIO) -> None:
    """Give back what was reserved beyond the allocated space of a flushed map."""
    end = allocation_end(file)
    if file.seek(0, os.SEEK_END) > end:
        file.truncate(end)
