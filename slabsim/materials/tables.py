"""Material tables: text files whose header names the columns and their units.

    wavelength (um); n; k            frequency (THz), eps_re, eps_im
    0,4; 1,47; 0,01                  0.5, 2.34, 0.002

Between the rows Re(eps) and Im(eps) are interpolated over frequency by monotone cubic pieces (PCHIP),
which never overshoot the data; beyond the rows nothing is known.
"""

import re
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from slabsim.errors import MaterialError, UnitError
from slabsim.materials.material import PASSIVE, Material
from slabsim.units import read_unit, spectral_kind, to_hz

_SPECTRAL = {"frequency": ("frequency", "angular frequency"), "wavelength": ("wavelength",)}
_SPECTRAL |= {"wavenumber": ("wavenumber",), "energy": ("photon energy",)}
_VALUES = (("n", "k"), ("eps_re", "eps_im"))
_EXAMPLE = 'the header must read like "wavelength (um), n, k" or "frequency (THz), eps_re, eps_im", without a #'
_COLUMN = re.compile(r"(?P<name>[^(\[]*?)\s*(?:[(\[](?P<unit>[^)\]]*)[)\]])?")


@dataclass(frozen=True, eq=False)
class Tabulated:
    """Permittivity between the rows of a table.

    Parameters
    ----------
    frequency : float array, shape (n_rows,)
        Ascending [Hz].
    eps : complex array, shape (n_rows,)
        Relative permittivity.
    """

    frequency: np.ndarray
    eps: np.ndarray

    def __call__(self, frequency: np.ndarray) -> np.ndarray:
        real, imaginary = self._pieces
        return real(frequency) + 1j * imaginary(frequency)

    @cached_property
    def _pieces(self) -> tuple[Any, Any]:
        from scipy.interpolate import PchipInterpolator

        return tuple(PchipInterpolator(self.frequency, part) for part in (self.eps.real, self.eps.imag))


@dataclass(frozen=True)
class _Header:
    separator: str
    unit: str
    columns: tuple[int, int, int]  # spectral, n or eps_re, k or eps_im
    width: int
    is_index: bool


def read_table(name: str, text: str, file_name: str) -> Material:
    """Material whose permittivity is tabulated.

    Parameters
    ----------
    name, file_name : str
        Name of the material; name of the file, for messages.
    text : str
        The file: a header, then one row per spectral point, in either order. Separators are comma,
        semicolon or tab; with the latter two numbers may have a decimal comma. Lines with ``#`` and
        empty lines are skipped.

    Returns
    -------
    Material

    Raises
    ------
    MaterialError
        Names the file, the line, what stands there and what is allowed.
    """
    lines = [(number, line) for number, line in enumerate(text.lstrip("\ufeff").splitlines(), 1)]
    lines = [(number, line.split("#")[0].strip()) for number, line in lines]
    lines = [(number, line) for number, line in lines if line]
    if not lines:
        raise MaterialError(f"{file_name} is empty; {_EXAMPLE}")
    header = _read_header(lines[0][1], f"{file_name}, line {lines[0][0]}")
    rows = np.array([_read_row(line, header, f"{file_name}, line {number}") for number, line in lines[1:]])
    if len(rows) < 2:
        raise MaterialError(f"{file_name} has {len(rows)} data rows; at least 2 are needed to interpolate")
    frequency = to_hz(rows[:, 0], header.unit)
    eps = (rows[:, 1] + 1j * rows[:, 2]) ** 2 if header.is_index else rows[:, 1] + 1j * rows[:, 2]
    order = np.argsort(frequency)
    twins = np.flatnonzero(np.diff(frequency[order]) <= 0.0)
    if twins.size:
        first, second = sorted(lines[1 + row][0] for row in order[twins[0] : twins[0] + 2])
        raise MaterialError(f"{file_name}, lines {first} and {second}: the same spectral point twice; keep one")
    span = (float(frequency.min()), float(frequency.max()))
    return Material(name, Tabulated(frequency[order], eps[order]), None, span, header.unit)


def _read_header(line: str, where: str) -> _Header:
    separator = next((mark for mark in "\t;," if mark in line), ",")
    columns = [_COLUMN.fullmatch(cell.strip(' "')) for cell in line.split(separator)]
    names = [column["name"].strip().lower() if column else "" for column in columns]
    spectral = [index for index, name in enumerate(names) if name in _SPECTRAL]
    pairs = [pair for pair in _VALUES if set(pair) <= set(names)]
    if len(spectral) != 1 or len(pairs) != 1 or len(set(names)) != len(names):
        raise MaterialError(f'{where}: "{line}" does not name its columns; {_EXAMPLE}')
    column = columns[spectral[0]]
    unit_text = column["unit"] if column else None
    name = names[spectral[0]]
    if not unit_text:
        raise MaterialError(f'{where}: the column "{name}" names no unit; {_EXAMPLE}')
    try:
        unit = read_unit(unit_text, "spectral")
    except UnitError as error:
        raise MaterialError(f'{where}: the column "{name}": {error}') from None
    if spectral_kind(unit) not in _SPECTRAL[name]:
        raise MaterialError(f'{where}: the column "{name}" is in {unit}, a unit of {spectral_kind(unit)}')
    places = (spectral[0], names.index(pairs[0][0]), names.index(pairs[0][1]))
    return _Header(separator, unit, places, len(names), pairs[0] == ("n", "k"))


def _read_row(line: str, header: _Header, where: str) -> list[float]:
    cells = [cell.strip(' "') for cell in line.split(header.separator)]
    if len(cells) != header.width:
        cure = "; a decimal comma needs another separator (; or tab)" if header.separator == "," else ""
        raise MaterialError(f"{where}: {len(cells)} cells, but the header names {header.width}{cure}")
    values = [_read_number(cells[column], header, where) for column in header.columns]
    if values[0] <= 0.0:
        raise MaterialError(f"{where}: the spectral value {values[0]:g} {header.unit} must be positive")
    im_eps = 2.0 * values[1] * values[2] if header.is_index else values[2]
    if im_eps < 0.0:
        what = f"n = {values[1]:g}, k = {values[2]:g}: " if header.is_index else ""
        raise MaterialError(f"{where}: {what}Im(eps) = {im_eps:g} would amplify; {PASSIVE}")
    return values


def _read_number(cell: str, header: _Header, where: str) -> float:
    decimal = cell.replace(",", ".") if header.separator != "," else cell
    try:
        value = float(decimal)
    except ValueError:
        raise MaterialError(f'{where}: "{cell}" is no number') from None
    if not np.isfinite(value):
        raise MaterialError(f'{where}: "{cell}" is not finite')
    return value
