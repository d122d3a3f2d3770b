"""The reader of a map: axes, texts, progress, and quantities slice by slice."""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from types import TracebackType
from typing import Any, Self

import h5py
import numpy as np

from slabsim.errors import InputError, MapError
from slabsim.stack.sample import Stack
from slabsim.store import layout
from slabsim.store.failures import RESUME_CURE, failures_explained, open_file
from slabsim.store.identity import Identity, read_channels, read_text


def open_map(path: str | os.PathLike[str]) -> SweepMap:
    """Open a map for reading, also while a run is writing it.

    Parameters
    ----------
    path : path
        A map file.

    Returns
    -------
    SweepMap
        A context manager; nothing but axes and texts is read before it is asked for.

    Raises
    ------
    MapError
        If there is no such file, or it is no map, cut short, of another format, or damaged.
    """
    source = Path(path).resolve()
    file = open_file(source, "r", locking=False)
    try:
        with failures_explained(source, "read"):
            return SweepMap(source, file)
    except BaseException:
        file.close()
        raise


class SweepMap:
    """A map open for reading.

    Parameters
    ----------
    path : Path
    file : h5py.File
        Open for reading; closed with the map.

    Attributes
    ----------
    frequencies : float array, shape (n_freqs,)
        [Hz]
    angles_deg, azimuths_deg : float array, shape (n_angles,), (n_azimuths,)
        [degrees]
    polarizations : tuple of {"TE", "TM"}
        Of the incident wave.
    channels : tuple of {"TE", "TM", "TE_to_TM", "TM_to_TE"}
        Rows of everything but the absorptance: the polarizations, and their cross terms if the stack mixes them.
    quantities : tuple of str
        Names that `read` takes.
    title, file_name, stack_text : str
        Of the stack file: its title, name and text.
    tables : dict of str to str
        Name and text of the table files it refers to.
    model : str
    models, environment : dict of str to str
        Models and formulas, and program versions, that produced the numbers.
    version : str
        Version of slabsim that produced the numbers.
    start_time, end_time : str
        ISO 8601, UTC; an unfinished map has its start time in both.
    block_shape : tuple of int
        Frequencies and angles of a full block.
    """

    def __init__(self, path: Path, file: h5py.File) -> None:
        self.path = path
        self._file = file
        _check_format(path, file)
        identity = Identity.read(file)
        self._identity = identity
        self.frequencies = identity.axes["frequency"]
        self.angles_deg = identity.axes["angle"]
        self.azimuths_deg = identity.axes["azimuth"]
        self.polarizations = identity.polarizations
        self.channels = read_channels(file)
        self.model = identity.model
        self.stack_text = identity.text
        self.tables = identity.tables
        self.file_name = read_text(file[f"{layout.STACK_NOTE}/file_name"])
        self.title = read_text(file[f"{layout.ENTRY}/title"])
        self.version = read_text(file[f"{layout.PROCESS}/version"])
        self.models = _texts(file[layout.MODELS])
        self.environment = _texts(file[layout.ENVIRONMENT])
        self.start_time = read_text(file[f"{layout.ENTRY}/start_time"])
        self.end_time = read_text(file[f"{layout.ENTRY}/end_time"])
        shape = file[layout.BLOCK_SHAPE][()]
        self.block_shape = (int(shape[0]), int(shape[1]))
        self.quantities = tuple(q.name for q in layout.QUANTITIES if q.name in file[layout.DATA])

    @property
    def state(self) -> str:
        """ "running" or "complete"; a map whose run was stopped stays "running"."""
        with failures_explained(self.path, "read"):
            return read_text(self._file[layout.STATE])

    @property
    def is_complete(self) -> bool:
        """Whether every block is done."""
        return self.state == layout.COMPLETE

    @property
    def flags(self) -> np.ndarray:
        """Flag of every block: uint8 array (azimuth, frequency, angle); 0 pending, 1 done, 2 failed."""
        with failures_explained(self.path, "read"):
            return self._file[layout.BLOCK_DONE][()]

    @property
    def block_states(self) -> dict[str, int]:
        """Number of blocks "pending", "done" and "failed"."""
        counts = np.bincount(self.flags.ravel(), minlength=3)
        return {name: int(counts[flag]) for flag, name in enumerate(layout.BLOCK_FLAGS.split())}

    def read(
        self,
        name: str,
        polarization: str,
        azimuth: int = 0,
        frequencies: slice = slice(None),
        angles: slice = slice(None),
    ) -> np.ndarray:
        """One quantity of one polarization at one azimuth.

        Parameters
        ----------
        name : str
            One of `quantities`.
        polarization : {"TE", "TM", "TE_to_TM", "TM_to_TE"}
            One of `channels`; of `polarizations` for the absorptance.
        azimuth : int
            Index into `azimuths_deg`.
        frequencies, angles : slice
            Part of the grid; contiguous.

        Returns
        -------
        float array, shape (n_freqs, n_angles)
            NaN where a point has no value or its block is not done.

        Raises
        ------
        InputError
            If the map holds no such quantity, polarization or azimuth.
        MapError
            If a finished block cannot be read.
        """
        self._check_choice("quantity", name, self.quantities)
        rows = self.polarizations if name == "absorptance" else self.channels
        self._check_choice("polarization", polarization, rows)
        if not 0 <= azimuth < self.azimuths_deg.size:
            raise InputError(f"azimuth = {azimuth}; {self.path} has the indices 0 to {self.azimuths_deg.size - 1}")
        row = rows.index(polarization)
        with failures_explained(self.path, "read"):
            dataset = self._file[layout.DATA][name]
            try:
                return dataset[azimuth, row, frequencies, angles]
            except OSError:  # an interrupted run leaves part of a pending block without its end
                return self._read_done(dataset, azimuth, row)[frequencies, angles]

    def read_amplitude(
        self,
        name: str,
        polarization: str,
        azimuth: int = 0,
        frequencies: slice = slice(None),
        angles: slice = slice(None),
    ) -> np.ndarray:
        """Complex amplitude "r" or "t"; otherwise as `read`, shape (n_freqs, n_angles)."""
        where = (polarization, azimuth, frequencies, angles)
        real = self.read(f"{name}_real", *where)
        return real + 1j * self.read(f"{name}_imag", *where)

    def check_same(self, stack: Stack) -> None:
        """Raise `MapError` if the map does not belong to the sweep that `stack` asks for."""
        now = Identity.of(stack)
        with failures_explained(self.path, "read"):
            if not now.text:
                raise MapError(
                    f"{self.path}: a stack without text cannot be compared with the one of the map; read the stack "
                    "from a file, or compute another map"
                )
            if read_text(self._file[layout.DIGEST]) == now.digest():
                return
        changes = "; ".join(self._identity.changes(now)) or "its digest does not fit its own content"
        raise MapError(
            f"{self.path}: this map belongs to another computation: {changes}; go on with the stack file as it was "
            "(the map holds its text), or compute another map, or --replace this one"
        )

    def read_comparison(self, name: str, polarization: str) -> np.ndarray:
        """A stored difference, float array of shape (n_freqs, n_angles), at the first azimuth."""
        with self._comparison() as group:
            self._check_choice("comparison", name, tuple(n for n, item in group.items() if item.ndim == 3))
            rows = self.channels if group[name].shape[0] == len(self.channels) else self.polarizations
            self._check_choice("polarization", polarization, rows)
            return group[name][rows.index(polarization)]

    def comparison_attributes(self) -> dict[str, Any]:
        """What was stored beside the differences."""
        with self._comparison() as group:
            return dict(group.attrs)

    def close(self) -> None:
        """Close the file."""
        self._file.close()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    @contextmanager
    def _comparison(self) -> Iterator[h5py.Group]:
        if layout.COMPARISON not in self._file:
            raise MapError(f"{self.path}: this map holds no comparison; make one first")
        with failures_explained(self.path, "read"):
            yield self._file[layout.COMPARISON]

    def _check_choice(self, what: str, name: str, allowed: tuple[str, ...]) -> None:
        if name not in allowed:
            raise InputError(f"{what} {name!r}: {self.path} has {', '.join(allowed) or 'none'}")

    def _read_done(self, dataset: h5py.Dataset, azimuth: int, row: int) -> np.ndarray:
        values = np.full((self.frequencies.size, self.angles_deg.size), np.nan)
        n_freqs, n_angles = self.block_shape
        for i, j in np.argwhere(self.flags[azimuth] == layout.DONE):
            place = (slice(i * n_freqs, (i + 1) * n_freqs), slice(j * n_angles, (j + 1) * n_angles))
            try:
                values[place] = dataset[azimuth, row, *place]
            except OSError as error:
                first, last = self.frequencies[place[0]][[0, -1]]
                cure = "compute the map again with --replace"
                if not self.is_complete:
                    cure = f"compute it again with: {RESUME_CURE.format(path=self.path)}"
                raise MapError(
                    f"{self.path}: {dataset.name} is damaged between {first:.6g} and {last:.6g} Hz: a finished "
                    f"block cannot be read; restore a copy, or {cure}"
                ) from error
        return values


def _check_format(path: Path, file: h5py.File) -> None:
    found = file.attrs.get("slabsim_format")
    if found is None:
        raise MapError(f"{path}: this HDF5 file is no slabsim map; give the path of a file written by slabsim sweep")
    if found != layout.FORMAT:
        raise MapError(
            f"{path}: the map has format {found}, this program reads format {layout.FORMAT}; use the version of "
            f"slabsim that wrote it ({file.attrs.get('creator_version', 'unknown')}), or compute it again with "
            "--replace"
        )


def _texts(group: h5py.Group) -> dict[str, str]:
    return {name: read_text(item) for name, item in group.items()}
