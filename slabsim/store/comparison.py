"""Differences of a map from another computation, stored in the map beside its data."""

from __future__ import annotations

import os
import shutil
from collections.abc import Mapping
from contextlib import suppress
from pathlib import Path
from typing import Any, NamedTuple

import h5py
import numpy as np

from slabsim.errors import InputError, MapError
from slabsim.store import layout
from slabsim.store.creation import OBJECTS_V110, describe, name_axes
from slabsim.store.failures import failures_explained, is_held
from slabsim.store.reader import open_map
from slabsim.store.room import allocation_end, reserve, trim

_GRID = ("frequency", "angle")


class Field(NamedTuple):
    """A difference over the grid: `values`, shape (n_channels or n_polarizations, n_freqs, n_angles), name and unit."""

    values: np.ndarray
    long_name: str
    units: str = "1"


def write_comparison(path: str | os.PathLike[str], fields: Mapping[str, Field], attributes: Mapping[str, Any]) -> None:
    """Store differences in a map as /entry/comparison, in place of earlier ones.

    The map is copied, completed and moved back, so that a kill at any moment leaves it as it was.

    Parameters
    ----------
    path : path
        An existing map.
    fields : mapping of str to Field (or a tuple of its parts)
        At least one; the first is the signal.
    attributes : mapping
        Numbers and texts kept beside them.

    Raises
    ------
    InputError
        If a field does not fit the grid of the map.
    MapError
        If the map cannot be read or written, or another process is writing it.
    """
    target = Path(path).resolve()
    fields = {name: Field(*field) for name, field in fields.items()}
    _check_fields(target, fields)
    if is_held(target):
        raise MapError(f"{target}: another process is writing this map; wait for it, then try again")
    unfinished = target.with_name(f".{target.name}.new")
    try:
        with failures_explained(target, "written"):
            shutil.copyfile(target, unfinished)
            with unfinished.open("r+b", buffering=0) as raw:
                needed = sum(np.size(field.values) for field in fields.values()) * 8 * 2 + 65536  # 2: chunk edges
                reserve(raw, allocation_end(raw), needed)
                with h5py.File(unfinished, "r+", libver=OBJECTS_V110) as file:
                    _write(file, fields, attributes)
                trim(raw)
            os.replace(unfinished, target)
    finally:
        with suppress(OSError):
            unfinished.unlink()


def _check_fields(target: Path, fields: Mapping[str, Field]) -> None:
    if not fields:
        raise InputError("fields is empty; a comparison needs at least one field")
    with open_map(target) as found:
        grid = (found.frequencies.size, found.angles_deg.size)
        shapes = [(len(rows), *grid) for rows in (found.channels, found.polarizations)]
    first = np.shape(next(iter(fields.values())).values)
    for name, field in fields.items():
        if np.shape(field.values) not in shapes or np.shape(field.values) != first:
            raise InputError(f"field {name!r} has shape {np.shape(field.values)}; {target} needs {shapes[0]}")


def _write(file: h5py.File, fields: Mapping[str, Field], attributes: Mapping[str, Any]) -> None:
    if layout.COMPARISON in file:
        del file[layout.COMPARISON]
    group = file.create_group(layout.COMPARISON, track_order=True)
    signal, *others = fields
    data, n_rows = file[layout.DATA], np.shape(fields[signal].values)[0]
    rows = "polarization" if data["polarization"].size == n_rows else "incident"
    if rows not in data:
        raise InputError('a difference of absorptances needs a map that keeps powers: store = ["power"]')
    axes = (rows, *_GRID)
    name_axes(group, signal, axes, others)
    group.attrs.update(attributes)
    scales = [data[name] for name in axes]
    for name, scale in zip(axes, scales, strict=True):
        group[name] = scale
    for name, field in fields.items():
        dataset = group.create_dataset(
            name, data=np.asarray(field.values, dtype="<f8"), fletcher32=True, fillvalue=np.nan
        )
        describe(dataset, scales, field.long_name, field.units)
