"""Which computation a map belongs to: a resumed sweep must not mix two of them.

Two runs are the same computation when the stack text, the table files, the grid, the model and the
quantities kept agree to the last bit.
"""

from __future__ import annotations

import hashlib
import json
from dataclasses import dataclass
from itertools import zip_longest
from typing import TYPE_CHECKING

import numpy as np

from slabsim.store import layout

if TYPE_CHECKING:
    import h5py

    from slabsim.stack.sample import Stack


@dataclass(frozen=True)
class Identity:
    """All that decides the numbers of a map."""

    text: str
    tables: dict[str, str]
    axes: dict[str, np.ndarray]
    polarizations: tuple[str, ...]
    model: str
    store: tuple[str, ...]

    @classmethod
    def of(cls, stack: Stack) -> Identity:
        """Identity of the sweep that a stack asks for."""
        sweep = stack.sweep
        axes = {
            "frequency": sweep.frequencies,
            "angle": sweep.angles_deg,
            "azimuth": sweep.azimuths_deg,
        }
        return cls(
            stack.text,
            dict(stack.tables),
            {name: np.asarray(values, dtype="<f8") for name, values in axes.items()},
            tuple(sweep.polarizations),
            sweep.model,
            tuple(sorted(set(sweep.store))),
        )

    @classmethod
    def read(cls, file: h5py.File) -> Identity:
        """Identity of an open map."""
        data = file[layout.DATA]
        kinds = {quantity.kind for quantity in layout.QUANTITIES if quantity.name in data}
        return cls(
            read_text(file[f"{layout.STACK_NOTE}/data"]),
            read_tables(file),
            {name: data[name][()] for name in ("frequency", "angle", "azimuth")},
            tuple(name for name in read_channels(file) if name in layout.POLARIZATIONS),
            read_text(file[f"{layout.MODELS}/wire_medium"]),
            tuple(sorted(kinds)),
        )

    def digest(self) -> str:
        """SHA-256 in hexadecimal."""
        words = [self.text, sorted(self.tables.items()), self.polarizations, self.model, self.store]
        shapes = [(name, self.axes[name].size) for name in sorted(self.axes)]
        total = hashlib.sha256(json.dumps([words, shapes]).encode())
        for name, _ in shapes:
            total.update(self.axes[name].tobytes())
        return total.hexdigest()

    def changes(self, now: Identity) -> list[str]:
        """What differs, a clause each: first the map's state (`self`), then the state `now`."""
        found = _line_changes("the stack text", self.text, now.text)
        for name in sorted(self.tables.keys() | now.tables.keys()):
            old, new = self.tables.get(name), now.tables.get(name)
            if old is None or new is None:
                found.append(f"table file {name!r} is {'new' if old is None else 'no longer used'}")
            else:
                found += _line_changes(f"table file {name!r}", old, new)
        for name, values in self.axes.items():
            if not np.array_equal(values, now.axes[name]):
                found.append(f"{name}: the map has {_span(values)}; now {_span(now.axes[name])}")
        for name in ("polarizations", "model", "store"):
            if getattr(self, name) != getattr(now, name):
                found.append(f"{name}: the map has {getattr(self, name)!r}; now {getattr(now, name)!r}")
        return found


def digest(stack: Stack) -> str:
    """SHA-256 of the computation that a stack asks for, in hexadecimal."""
    return Identity.of(stack).digest()


def read_channels(file: h5py.File) -> tuple[str, ...]:
    """Channels of an open map: its incident polarizations, then their cross terms if there are any."""
    return tuple(layout.CHANNELS[code] for code in file[layout.DATA]["polarization"][()])


def read_text(dataset: h5py.Dataset) -> str:
    """A scalar string dataset as str."""
    value = dataset[()]
    return value.decode("utf-8") if isinstance(value, bytes) else str(value)


def read_tables(file: h5py.File) -> dict[str, str]:
    """Name and text of every table file kept in an open map."""
    process = file[layout.PROCESS]
    tables, count = {}, 1
    while (note := layout.TABLE_NOTE.format(count)) in process:
        tables[read_text(process[note]["file_name"])] = read_text(process[note]["data"])
        count += 1
    return tables


def _line_changes(what: str, old: str, new: str) -> list[str]:
    if old == new:
        return []
    pairs = enumerate(zip_longest(old.split("\n"), new.split("\n")), start=1)
    number, (was, now) = next((number, pair) for number, pair in pairs if pair[0] != pair[1])
    return [f"{what} differs from line {number} on: the map has {_quote(was)}; now {_quote(now)}"]


def _quote(line: str | None) -> str:
    return "nothing" if line is None else repr(line if len(line) <= 60 else f"{line[:57]}...")


def _span(values: np.ndarray) -> str:
    if values.size == 1:
        return f"1 point at {values[0]:.10g}"
    return f"{values.size} points from {values[0]:.10g} to {values[-1]:.10g}"
