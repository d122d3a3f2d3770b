"""An empty map: the whole layout, with every block pending.

Two choices here decide whether a map survives a kill at any moment (tests/sweeps/test_kills.py):

- Superblock version 2 (``libver`` low bound v108). Version 3 carries a mark "open for writing" that
  makes the file refuse to open after a kill.
- Chunk indexes of the fixed-array kind (low bound v110 once the superblock stands). The older B-tree
  splits its nodes as chunks come in, and a kill between the writes of a split loses finished blocks.

For the same reason nothing of the layout changes during a run. State and end time are strings of
fixed length, overwritten in place; one NaN is written to every dataset, which makes its chunk index.
"""

from __future__ import annotations

from collections.abc import Mapping
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

import h5py
import numpy as np

from slabsim.store import layout
from slabsim.store.identity import digest

if TYPE_CHECKING:
    from slabsim.stack.sample import Stack
    from slabsim.store.blocks import Plan
    from slabsim.store.provenance import Provenance

OBJECTS_V110 = ("v110", "v110")


def timestamp() -> str:
    """Now, UTC, ISO 8601, always 25 characters."""
    return datetime.now(UTC).isoformat(timespec="seconds")


def build(
    path: Path,
    stack: Stack,
    plan: Plan,
    provenance: Provenance,
    *,
    compress: bool = False,
    start_time: str | None = None,
) -> None:
    """Write the map of `stack` with every block pending to `path`, over whatever is there."""
    start_time = start_time or timestamp()
    with h5py.File(path, "w", libver=("v108", "v110"), track_order=True) as file:
        _mark(file["/"], "NXroot", _root_attributes(provenance, start_time))
    with h5py.File(path, "r+", libver=OBJECTS_V110, track_order=True) as file:
        entry = _group(file, layout.ENTRY, "NXentry", default="plot")
        _fill(entry, {"title": stack.title, "start_time": start_time})
        _fixed_text(entry, "end_time", start_time)
        filters = _filters(compress)
        _write_data(file, stack, plan, filters)
        _write_plot(file, stack, plan, filters)
        _write_process(file, stack, provenance, start_time)
        _write_progress(file, stack, plan)
        for name in file[layout.DATA]:
            file[name] = h5py.SoftLink(f"{layout.DATA}/{name}")


def block_size(stack: Stack, plan: Plan) -> int:
    """Most bytes that a block takes in the file."""
    chunk = 8 * int(np.prod(plan.block_shape)) + 4  # 4: checksum; chunks at the far edge are whole, too
    return chunk * len(stack.channels) * (len(layout.quantities(stack)) + 1)  # 1: the 2-D copies


def empty_size(stack: Stack, plan: Plan) -> int:
    """About the bytes of a map with no block done."""
    texts = len(stack.text.encode()) + sum(len(text.encode()) for text in stack.tables.values())
    axes = 8 * (stack.sweep.frequencies.size + stack.sweep.angles_deg.size + stack.sweep.azimuths_deg.size)
    # 16: index entry of a chunk
    n_entries = int(np.prod(plan.block_counts)) * len(stack.channels) * 8
    return block_size(stack, plan) + texts + axes + 16 * n_entries + 65536


def full_size(stack: Stack, plan: Plan) -> int:
    """About the bytes of a complete map, not compressed."""
    return empty_size(stack, plan) + int(np.prod(plan.block_counts)) * block_size(stack, plan)


def write_axis(group: h5py.Group, axis: layout.Axis, stack: Stack) -> None:
    """Write one axis as a dimension scale."""
    dataset = group.create_dataset(axis.name, data=np.asarray(axis.values(stack), dtype=axis.dtype))
    dataset.make_scale(axis.name)
    dataset.attrs.update(units=axis.units, long_name=axis.long_name)
    if axis.flag_meanings:
        meanings = axis.flag_meanings(stack)
        codes = np.arange(len(meanings.split()), dtype=axis.dtype)
        dataset.attrs.update(flag_values=codes, flag_meanings=meanings)


def describe(dataset: h5py.Dataset, scales: list[h5py.Dataset], long_name: str, units: str) -> None:
    """Attach axes and name to a dataset as NeXus and CF readers expect them."""
    for dimension, scale in zip(dataset.dims, scales, strict=True):
        dimension.attach_scale(scale)
    names = [scale.name.rsplit("/", 1)[-1] for scale in scales]
    dataset.attrs.update(units=units, long_name=long_name, _FillValue=np.float64(np.nan), coordinates=" ".join(names))


def name_axes(group: h5py.Group, signal: str, axes: tuple[str, ...], auxiliary: list[str]) -> None:
    """Make a group an NXdata group with its signal and axes."""
    group.attrs.update(NX_class="NXdata", signal=signal, axes=list(axes))
    for position, name in enumerate(axes):
        group.attrs[f"{name}_indices"] = np.int32(position)
    if auxiliary:
        group.attrs["auxiliary_signals"] = auxiliary


def _write_data(file: h5py.File, stack: Stack, plan: Plan, filters: dict[str, Any]) -> None:
    group = file.create_group(layout.DATA, track_order=True)
    kept = layout.quantities(stack)
    signal = kept[0]
    same_axes = [q.name for q in kept[1:] if q.axes == signal.axes]
    name_axes(group, signal.name, signal.axes, same_axes)
    group.attrs.update(time_convention=layout.TIME_CONVENTION, amplitude=layout.AMPLITUDE)
    used = {name for quantity in kept for name in quantity.axes}
    for axis in layout.AXES:
        if axis.name in used:
            write_axis(group, axis, stack)
    if "incident" in used:
        group.attrs["incident_indices"] = np.int32(1)
    for quantity in kept:
        scales = [group[name] for name in quantity.axes]
        shape = tuple(scale.size for scale in scales)
        chunks = (1, 1, *plan.block_shape)
        dataset = group.create_dataset(quantity.name, shape, quantity.dtype, chunks=chunks, **filters)
        describe(dataset, scales, quantity.long_name, quantity.units)
        dataset[0, 0, 0, 0] = np.nan


def _write_plot(file: h5py.File, stack: Stack, plan: Plan, filters: dict[str, Any]) -> None:
    group = file.create_group(layout.PLOT, track_order=True)
    quantity = layout.plotted(stack)
    # TM first: wires along z act on TM alone
    shown = [*sorted(stack.sweep.polarizations, reverse=True), *stack.channels[len(stack.sweep.polarizations) :]]
    names = [layout.plot_name(quantity, polarization) for polarization in shown]
    name_axes(group, names[0], ("frequency", "angle"), names[1:])
    scales = [file[f"{layout.DATA}/{name}"] for name in ("frequency", "angle")]
    for scale in scales:
        group[scale.name.rsplit("/", 1)[-1]] = scale
    for name, polarization in zip(names, shown, strict=True):
        shape = tuple(scale.size for scale in scales)
        dataset = group.create_dataset(name, shape, quantity.dtype, chunks=plan.block_shape, **filters)
        describe(dataset, scales, f"{polarization.replace('_', ' ')} {quantity.name}", quantity.units)
        dataset[0, 0] = np.nan
    group["title"] = f"{stack.title}: {quantity.name}, azimuth {stack.sweep.azimuths_deg[0]:g} degree"


def _write_process(file: h5py.File, stack: Stack, provenance: Provenance, date: str) -> None:
    process = _group(file, layout.PROCESS, "NXprocess")
    _fill(process, {"program": "slabsim", "version": provenance.version, "date": date})
    process["sequence_index"] = np.int32(1)
    note = _group(file, layout.STACK_NOTE, "NXnote")
    _fill(note, {"type": "application/toml", "file_name": stack.file_name, "data": stack.text})
    for number, (name, text) in enumerate(stack.tables.items(), start=1):
        note = _group(process, layout.TABLE_NOTE.format(number), "NXnote")
        _fill(note, {"type": "text/csv", "file_name": name, "data": text})
    _fill(_group(file, layout.ENVIRONMENT, "NXcollection"), provenance.environment)
    _fill(_group(file, layout.MODELS, "NXcollection"), provenance.models)


def _write_progress(file: h5py.File, stack: Stack, plan: Plan) -> None:
    _fill(_group(file, layout.PROGRESS, "NXcollection"), {})
    _fixed_text(file, layout.STATE, layout.RUNNING, length=len(layout.COMPLETE))
    file[layout.DIGEST] = digest(stack)
    file[layout.BLOCK_SHAPE] = np.array(plan.block_shape, dtype="i8")
    flags = file.create_dataset(layout.BLOCK_DONE, data=np.full(plan.block_counts, layout.PENDING, "u1"))
    flags.attrs.update(
        flag_values=np.array([layout.PENDING, layout.DONE, layout.FAILED], dtype="u1"),
        flag_meanings=layout.BLOCK_FLAGS,
        long_name="blocks along azimuth, frequency, angle",
    )


def _root_attributes(provenance: Provenance, start_time: str) -> dict[str, str]:
    return {
        "default": "entry",
        "creator": "slabsim",
        "creator_version": provenance.version,
        "slabsim_format": layout.FORMAT,
        "HDF5_Version": h5py.version.hdf5_version,
        "h5py_version": h5py.__version__,
        "file_time": start_time,
        "Conventions": "CF-1.11",
    }


def _filters(compress: bool) -> dict[str, Any]:
    filters: dict[str, Any] = {"fletcher32": True, "fillvalue": np.nan}
    if compress:
        filters.update(shuffle=True, compression="gzip", compression_opts=1)
    return filters


def _group(parent: h5py.Group, name: str, nx_class: str, **attributes: Any) -> h5py.Group:
    group = parent.create_group(name, track_order=True)
    _mark(group, nx_class, attributes)
    return group


def _mark(group: h5py.Group, nx_class: str, attributes: Mapping[str, Any]) -> None:
    group.attrs["NX_class"] = nx_class
    group.attrs.update(attributes)


def _fill(group: h5py.Group, texts: Mapping[str, str]) -> None:
    for name, text in texts.items():
        group[name] = text


def _fixed_text(group: h5py.Group, name: str, text: str, length: int | None = None) -> None:
    dtype = h5py.string_dtype("utf-8", length or len(text))
    group.create_dataset(name, data=np.array(text.encode(), dtype=dtype))
