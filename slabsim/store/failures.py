"""HDF5 failures in plain words: what happened to the map, and what to do about it."""

from __future__ import annotations

import errno
import re
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import h5py

from slabsim.errors import MapError

SIGNATURE = b"\x89HDF\r\n\x1a\n"  # HDF5 file format specification, section II.A
RESUME_CURE = "slabsim sweep STACK --output {path} --resume"

_FAILURES: tuple[type[Exception], ...] = (OSError, RuntimeError, KeyError, ValueError)
_GARBAGE = (TypeError, AttributeError, IndexError, MemoryError)  # h5py, where links or types are damaged
_FULL = {errno.ENOSPC, errno.EFBIG, errno.EDQUOT}
_REFUSED = {errno.EACCES, errno.EPERM, errno.EROFS}
_HELD = {errno.EAGAIN, errno.EWOULDBLOCK}


@contextmanager
def failures_explained(path: Path, doing: str) -> Iterator[None]:
    """Turn every failure of HDF5 or of the disk into a `MapError` that names `path` and the cure."""
    kinds = _FAILURES + _GARBAGE if doing == "read" else _FAILURES
    try:
        yield
    except kinds as error:
        raise MapError(f"{path}: {_explain(path, doing, error)}") from error


def open_file(path: Path, mode: str, **options: Any) -> h5py.File:
    """Open an HDF5 file.

    Raises
    ------
    MapError
        If there is no such file, it may not be opened, another process writes it, it is cut
        short, or it is no HDF5 file.
    """
    if path.is_dir():
        raise MapError(f"{path}: this is a folder; a map is a file, for example {path / 'map.h5'}")
    with failures_explained(path, "opened"):
        return h5py.File(path, mode, **options)


def has_signature(path: Path) -> bool:
    """Whether a file starts as HDF5 files do."""
    with failures_explained(path, "read"), path.open("rb") as file:
        return file.read(len(SIGNATURE)) == SIGNATURE


def is_held(path: Path) -> bool:
    """Whether another process has an HDF5 file open for writing."""
    try:
        h5py.File(path, "r").close()
    except OSError as error:
        return _is_lock_error(error)
    return False


def _explain(path: Path, doing: str, error: Exception) -> str:
    number, text = _number(error), str(error)
    if number in _FULL and doing == "created":
        return f"the disk is full, or a limit on file size is reached ({text[:120]}); make room; no map was made"
    if number in _FULL:
        return (
            f"the disk is full, or a limit on file size is reached ({text[:120]}); the finished blocks are "
            f"safe; make room, then go on with: {RESUME_CURE.format(path=path)}"
        )
    if _is_lock_error(error):
        return "another process is writing this map; wait for it or stop it, then try again"
    if "locking flag values" in text or "already open" in text:
        return "this program has the map open in another way; close that first"
    if number == errno.ENOENT:
        return "there is no such file or folder; check the spelling, or make the folder first"
    if number == errno.ENOTDIR:
        return "part of this path is a file where a folder is needed; choose another place"
    if number in _REFUSED:
        return f"it may not be {doing} ({text[:120]}); change the permissions or choose another folder"
    if "truncated file" in text:
        return (
            "the file is cut short, an incomplete copy for example; copy it again, or compute it again with --replace"
        )
    if "signature not found" in text:
        return "this is no HDF5 file, so no slabsim map; give the path of a map written by slabsim sweep"
    return (
        f"it cannot be {doing} ({text[:200]}); the file is damaged or no slabsim map; restore a copy, or "
        "compute it again with --replace"
    )


def _is_lock_error(error: Exception) -> bool:
    return _number(error) in _HELD or "unable to lock file" in str(error)


def _number(error: BaseException) -> int | None:
    """Error number of the system; HDF5 often has it only in its text."""
    if isinstance(error, OSError) and error.errno is not None:
        return error.errno
    found = re.search(r"errno = (\d+)", str(error))
    return int(found.group(1)) if found else None
