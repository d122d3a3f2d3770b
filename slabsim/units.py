"""Texts with units to SI numbers, and back.

The table is small and explicit: a unit that is not in it is refused, with the nearest one named.
Spectral quantities all become a frequency in Hz, whichever of the five kinds they are written in:

    frequency f      wavelength c/f      wavenumber f/c      photon energy h f      angular frequency 2 pi f
"""

import re
from difflib import get_close_matches
from math import isfinite, log10, pi
from typing import TYPE_CHECKING, Literal, NamedTuple, TypeVar

from slabsim.constants import C0, H_OVER_E, TWO_PI
from slabsim.errors import UnitError

if TYPE_CHECKING:
    import numpy as np

Dimension = Literal[
    "length",
    "spectral",
    "rate",
    "angle",
    "conductivity",
    "resistance",
    "inductance",
    "capacitance",
    "time",
]
Number = TypeVar("Number", float, "np.ndarray")


class Quantity(NamedTuple):
    """A number and its unit, as written; the unit in the spelling of the table."""

    value: float
    unit: str


# kind -> {unit: factor to the SI unit of the kind}; a factor below one is given as (1, divisor), because
# dividing by a power of ten rounds once: "50 um" is the double next to 50e-6
_TABLE: dict[str, dict[str, float | tuple[float, float]]] = {
    "length": {
        "m": 1.0,
        "km": 1e3,
        "cm": (1.0, 1e2),
        "mm": (1.0, 1e3),
        "um": (1.0, 1e6),
        "nm": (1.0, 1e9),
        "pm": (1.0, 1e12),
        "in": (25.4, 1e3),
        "mil": (25.4, 1e6),
    },
    "frequency": {"Hz": 1.0, "kHz": 1e3, "MHz": 1e6, "GHz": 1e9, "THz": 1e12, "PHz": 1e15},
    "angular frequency": {"rad/s": 1.0},
    "wavenumber": {"m^-1": 1.0, "cm^-1": 1e2, "mm^-1": 1e3, "um^-1": 1e6},
    "photon energy": {"eV": 1.0, "meV": (1.0, 1e3), "keV": 1e3},
    "angle": {"rad": 1.0, "mrad": (1.0, 1e3), "deg": (pi, 180.0)},
    "conductivity": {"S/m": 1.0, "S/cm": 1e2, "kS/m": 1e3, "MS/m": 1e6},
    "resistance": {"ohm": 1.0, "mohm": (1.0, 1e3), "kohm": 1e3, "Mohm": 1e6},
    "inductance": {
        "H": 1.0,
        "mH": (1.0, 1e3),
        "uH": (1.0, 1e6),
        "nH": (1.0, 1e9),
        "pH": (1.0, 1e12),
        "fH": (1.0, 1e15),
    },
    "capacitance": {
        "F": 1.0,
        "uF": (1.0, 1e6),
        "nF": (1.0, 1e9),
        "pF": (1.0, 1e12),
        "fF": (1.0, 1e15),
        "aF": (1.0, 1e18),
    },
    "time": {"s": 1.0, "ms": (1.0, 1e3), "us": (1.0, 1e6), "ns": (1.0, 1e9), "ps": (1.0, 1e12), "fs": (1.0, 1e15)},
}
_KINDS = {unit: kind for kind, units in _TABLE.items() for unit in units}
_RATES = ("frequency", "wavenumber", "photon energy", "angular frequency")
# dimension -> (kinds of unit it accepts, name with article, examples)
DIMENSIONS: dict[str, tuple[tuple[str, ...], str, tuple[str, ...]]] = {
    "length": (("length",), "a length", ("2.5 mm", "50 um")),
    "spectral": (
        (*_RATES, "length"),
        "a frequency, wavelength, wavenumber or photon energy",
        ("0.3 THz", "1.55 um", "300 cm^-1", "0.8 eV"),
    ),
    "rate": (_RATES, "a frequency (not a wavelength)", ("20 GHz", "4.05e13 rad/s", "215 cm^-1")),
    "angle": (("angle",), "an angle", ("30 deg",)),
    "conductivity": (("conductivity",), "a conductivity", ("5.8e7 S/m",)),
    "resistance": (("resistance",), "a resistance", ("50 ohm",)),
    "inductance": (("inductance",), "an inductance", ("1 nH",)),
    "capacitance": (("capacitance",), "a capacitance", ("0.1 pF",)),
    "time": (("time",), "a time", ("8.3 ps",)),
}
_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?")
_SPELLINGS = (("\u00b5", "u"), ("\u03bc", "u"), ("\u03a9", "ohm"), ("\u2126", "ohm"), ("\u00b0", "deg"))
_PER_LENGTH = re.compile(r"1/(cm|mm|um|m)|(cm|mm|um|m)(?:-1|\u207b\u00b9|\*\*-1)")


def units_of(dimension: Dimension) -> list[str]:
    """Units in which a quantity of `dimension` may be written."""
    kinds = DIMENSIONS[dimension][0]
    return [unit for unit, kind in _KINDS.items() if kind in kinds]


def spectral_kind(unit: str) -> str:
    """What a spectral `unit` measures: "frequency", "wavelength", "wavenumber", ..."""
    kind = _KINDS[unit]
    return "wavelength" if kind == "length" else kind


def read_unit(text: str, dimension: Dimension) -> str:
    """Spelling in the table of a unit of `dimension`.

    Raises
    ------
    UnitError
        If the unit is unknown, or of another dimension.
    """
    kinds, wanted, examples = DIMENSIONS[dimension]
    unit = _respell(text)
    if unit not in _KINDS:
        raise UnitError(f'unknown unit "{text}"; {wanted} is wanted{_nearest(unit, dimension)}')
    if _KINDS[unit] not in kinds:
        raise UnitError(f'"{text}" is a unit of {_KINDS[unit]}; {wanted} is wanted, {_such_as(examples)}')
    return unit


def read_quantity(text: object, dimension: Dimension) -> Quantity:
    """Number and unit of a text such as ``"2.5 mm"``, not converted.

    Raises
    ------
    UnitError
        If `text` is no text, has no finite number, no unit, or a unit of another dimension.
    """
    _, wanted, examples = DIMENSIONS[dimension]
    if not isinstance(text, str):
        found = f"{text!r} has no unit" if isinstance(text, int | float) else f"{text!r} is no text"
        raise UnitError(f"{found}; {wanted} is written as text with its unit, {_such_as(examples)}")
    number = _NUMBER.match(text.strip())
    if number is None:
        raise UnitError(f'"{text}" does not start with a finite number; {wanted} is wanted, {_such_as(examples)}')
    unit_text = text.strip()[number.end() :].strip()
    if not unit_text:
        raise UnitError(f'"{text}" has no unit; {wanted} is wanted, {_such_as(examples)}')
    if unit_text.startswith(","):
        raise UnitError(f'"{text}": write the number with a decimal point, {_such_as(examples)}')
    value = float(number.group())
    if not isfinite(value):
        raise UnitError(f'"{text}" is too large a number; {wanted} is wanted, {_such_as(examples)}')
    try:
        return Quantity(value, read_unit(unit_text, dimension))
    except UnitError as error:
        raise UnitError(f'"{text}": {error}') from None


def parse(text: object, dimension: Dimension) -> float:
    """SI value of a text with a unit.

    Parameters
    ----------
    text : str
        A number and a unit, the space between them optional: ``"2.5 mm"``, ``"5.8e7 S/m"``.
    dimension : str
        What the text must be. "spectral" takes any of the five spectral kinds and gives Hz; "rate"
        the same without wavelengths (a width is not the inverse of a length); "angle" gives radians.

    Returns
    -------
    float
        Value in m, Hz, rad, S/m, ohm, H, F or s.

    Raises
    ------
    UnitError
        Says what stands there, what is wanted and an example.
    """
    value, unit = read_quantity(text, dimension)
    if dimension not in ("spectral", "rate"):
        return to_si(value, unit)
    if spectral_kind(unit) == "wavelength" and value == 0.0:
        raise UnitError(f'"{text}": a wavelength cannot be zero')
    return to_hz(value, unit)


def to_si(value: Number, unit: str) -> Number:
    """Number in the SI unit of the same kind (angles in rad, photon energies in eV)."""
    factor = _TABLE[_KINDS[unit]][unit]
    return value * factor[0] / factor[1] if isinstance(factor, tuple) else value * factor


def to_hz(value: Number, unit: str) -> Number:
    """Frequency [Hz] of a spectral `value` in `unit`; numbers or arrays of any shape."""
    kind, scaled = _KINDS[unit], to_si(value, unit)
    if kind == "length":
        return C0 / scaled
    if kind == "wavenumber":
        return C0 * scaled
    if kind == "photon energy":
        return scaled / H_OVER_E
    return scaled / TWO_PI if kind == "angular frequency" else scaled


def from_hz(frequency: Number, unit: str) -> Number:
    """Value in the spectral `unit` of a `frequency` [Hz]; numbers or arrays of any shape."""
    kind, size = _KINDS[unit], to_si(1.0, unit)
    if kind == "length":
        return C0 / size / frequency
    if kind == "wavenumber":
        return frequency / (C0 * size)
    if kind == "photon energy":
        return frequency * (H_OVER_E / size)
    return frequency * (TWO_PI / size if kind == "angular frequency" else 1.0 / size)


def format_length(length: float, digits: int = 6) -> str:
    """A `length` [m] in km, m, mm, um, nm or pm: ``"2.5 mm"``."""
    return _engineering(length, ("pm", "nm", "um", "mm", "m", "km"), -12, digits)


def format_frequency(frequency: float, digits: int = 6) -> str:
    """A `frequency` [Hz] in Hz to PHz: ``"12.3 GHz"``."""
    return _engineering(frequency, ("Hz", "kHz", "MHz", "GHz", "THz", "PHz"), 0, digits)


def format_spectral(frequency: float, unit: str, digits: int = 6) -> str:
    """A `frequency` [Hz] in a spectral `unit`: ``"1.55 um"``."""
    return f"{from_hz(frequency, unit):.{digits}g} {unit}"


def _engineering(value: float, names: tuple[str, ...], lowest: int, digits: int) -> str:
    if value == 0.0 or not isfinite(value):
        return f"{value:g} {names[-lowest // 3]}"
    # rounding first, so that 999.9999999 um becomes 1 mm
    rounded = float(f"{value:.{digits}g}")
    step = int((log10(abs(rounded)) + 1e-9 - lowest) // 3)
    step = min(max(step, 0), len(names) - 1)
    return f"{rounded / 10.0 ** (lowest + 3 * step):.{digits}g} {names[step]}"


def _respell(text: str) -> str:
    unit = text.strip()
    for other, spelling in _SPELLINGS:
        unit = unit.replace(other, spelling)
    per_length = _PER_LENGTH.fullmatch(unit)
    return f"{per_length[1] or per_length[2]}^-1" if per_length else unit


def _nearest(unit: str, dimension: Dimension) -> str:
    known = units_of(dimension)
    folded = {name.lower(): name for name in reversed(known)}
    near = get_close_matches(unit.lower(), folded, n=1, cutoff=0.5)
    if near:
        return f'; did you mean "{folded[near[0]]}"?'
    return f"; known are {', '.join(known)}"


def _such_as(examples: tuple[str, ...]) -> str:
    return "such as " + " or ".join(f'"{example}"' for example in examples)
