"""A map whose run was killed in the middle of a write: is it sound, and if not, save what is finished.

A flush writes the data of a block, then the chunk indexes, then the superblock with the end of the
allocated space. A kill before the last step leaves chunks of the unfinished block beyond that end:

    | layout | block 0 | block 1 | end of allocation |  block 2, indexed  |

Writing on would allocate over them, so such a map is written anew from its finished blocks.
"""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING

import h5py
import numpy as np

from slabsim.store import layout
from slabsim.store.creation import OBJECTS_V110, block_size, build
from slabsim.store.identity import read_text
from slabsim.store.provenance import Provenance
from slabsim.store.room import allocation_end, reserve, trim

if TYPE_CHECKING:
    from slabsim.stack.sample import Stack
    from slabsim.store.blocks import Place, Plan


def is_sound(file: h5py.File, end: int) -> bool:
    """Whether all finished blocks are there and nothing lies beyond `end` or over something else."""
    try:
        done = file[layout.BLOCK_DONE][()] == layout.DONE
        extents: list[tuple[int, int]] = []
        for dataset in block_datasets(file):
            present = np.zeros([-(-n // c) for n, c in zip(dataset.shape, dataset.chunks, strict=True)], bool)
            for chunk in _chunks(dataset):
                position = np.array(chunk.chunk_offset) // dataset.chunks
                present[tuple(position)] = True
                extents.append((chunk.byte_offset, chunk.byte_offset + chunk.size))
            needed = done[0] if dataset.ndim == 2 else done[:, np.newaxis]
            if np.any(needed & ~present):
                return False
    except (OSError, RuntimeError, KeyError, AttributeError):  # AttributeError: a link leads nowhere
        return False
    extents.sort()
    starts, ends = np.array(extents, dtype=np.int64).reshape(-1, 2).T
    return bool(np.all(ends <= end) and np.all(starts[1:] >= ends[:-1]))


def rebuild(path: Path, target: Path, stack: Stack, plan: Plan) -> None:
    """Write a new map to `target` with the finished blocks of the map at `path`; the others are pending."""
    with h5py.File(path, "r") as old:
        process = old[layout.PROCESS]
        provenance = Provenance(
            read_text(process["version"]),
            {name: read_text(text) for name, text in old[layout.ENVIRONMENT].items()},
            {name: read_text(text) for name, text in old[layout.MODELS].items()},
        )
        compress = _is_compressed(old)
        started = read_text(old[f"{layout.ENTRY}/start_time"])
        build(target, stack, plan, provenance, compress=compress, start_time=started)
        with target.open("r+b", buffering=0) as raw:
            with h5py.File(target, "r+", libver=OBJECTS_V110) as new:
                flags = new[layout.BLOCK_DONE]
                for index in np.flatnonzero(old[layout.BLOCK_DONE][()] == layout.DONE):
                    reserve(raw, allocation_end(raw), block_size(stack, plan))
                    if _copy_block(old, new, plan.place(int(index))):
                        flags[np.unravel_index(index, flags.shape)] = layout.DONE
                    new.flush()
            trim(raw)


def block_datasets(file: h5py.File) -> list[h5py.Dataset]:
    """Every dataset that is written block by block."""
    quantities = [quantity.name for quantity in layout.QUANTITIES]
    in_data = [file[layout.DATA][name] for name in quantities if name in file[layout.DATA]]
    return in_data + [item for item in file[layout.PLOT].values() if item.chunks]


def _chunks(dataset: h5py.Dataset) -> Iterator[h5py.h5d.StoreInfo]:
    found: list[h5py.h5d.StoreInfo] = []
    dataset.id.chunk_iter(found.append)
    return iter(found)


def _is_compressed(file: h5py.File) -> bool:
    try:
        return any(dataset.compression for dataset in block_datasets(file))
    except (OSError, KeyError, AttributeError):
        return False


def _copy_block(old: h5py.File, new: h5py.File, place: Place) -> bool:
    where = (place.azimuth, slice(None), place.frequencies, place.angles)
    try:
        for dataset in block_datasets(old):
            if dataset.ndim == 4:
                new[dataset.name][where] = dataset[where]
            elif place.azimuth == 0:
                new[dataset.name][where[2:]] = dataset[where[2:]]
    except (OSError, KeyError, AttributeError):  # a finished block that cannot be read is computed again
        return False
    return True
