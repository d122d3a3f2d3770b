"""What was read from a stack file, with the derived numbers that a designer checks first."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from math import pi
from typing import Any

import numpy as np

from slabsim.constants import C0, TWO_PI
from slabsim.engine.pack import local_permittivity, wire_constants
from slabsim.errors import InputError
from slabsim.materials.material import Material
from slabsim.materials.wires import FORMULAS, fill_fraction, internal_impedance, plasma_wavenumber
from slabsim.stack.sample import Element, Film, Group, Layer, Patches, Stack, Strips, WireEnd, WireSet


@dataclass(frozen=True)
class Row:
    """One line of the stack, front to back: place ("3", "4.1"), kind, name and what it is made of."""

    place: str
    kind: str
    name: str
    thickness: float | None
    material: str
    eps: tuple[complex, complex] | None
    detail: str


@dataclass(frozen=True)
class PlasmaValue:
    """Plasma wavenumber by one formula [rad/m], and the plasma frequency in the host [Hz]."""

    formula: str
    kp: float
    frequency: float
    is_used: bool


@dataclass(frozen=True)
class WireNumbers:
    """Derived numbers of one wire set; pairs are at the two ends of the sweep.

    Attributes
    ----------
    layer : str
    wires : WireSet
    fill_fraction : float
    plasma : tuple of PlasmaValue
    pitch_over_wavelength : float
        Larger side of the cell over the wavelength in the host, at the top of the sweep.
    thickness_over_wavelength : (float, float)
        Of the layer, in the host.
    skin_depth : (float, float) or None
        1/Im(k_metal) [m]; None for a perfect conductor.
    impedance : (complex, complex) or None
        Internal impedance of one wire [ohm/m].
    local_eps : (complex, complex)
        Permittivity along the wires in the local model, the metal's loss and inductance included.
    tem_loss_db : (float, float)
        Loss of the wires' TEM mode, host included, over one pass of the layer [dB], at kx = 0.
    """

    layer: str
    wires: WireSet
    fill_fraction: float
    plasma: tuple[PlasmaValue, ...]
    pitch_over_wavelength: float
    thickness_over_wavelength: tuple[float, float]
    skin_depth: tuple[float, float] | None
    impedance: tuple[complex, complex] | None
    local_eps: tuple[complex, complex]
    tem_loss_db: tuple[float, float]


@dataclass(frozen=True)
class Description:
    """A stack in numbers: its rows, its wire sets, its sweep."""

    stack: Stack
    rows: tuple[Row, ...]
    wires: tuple[WireNumbers, ...]
    frequencies: tuple[float, float]


def describe_stack(stack: Stack) -> Description:
    """Rows and derived numbers of a stack, at the two ends of its sweep."""
    ends = (float(stack.sweep.frequencies[0]), float(stack.sweep.frequencies[-1]))
    rows = tuple(_rows(stack.elements, "", ends))
    distinct = dict.fromkeys(e for e in stack.flatten() if isinstance(e, Layer) and e.wires is not None)
    return Description(stack, rows, tuple(_wire_numbers(layer, ends) for layer in distinct), ends)


def _rows(elements: tuple[Element, ...], prefix: str, ends: tuple[float, float]) -> Iterator[Row]:
    for number, element in enumerate(elements, start=1):
        place = f"{prefix}{number}"
        if isinstance(element, Group):
            yield Row(place, "group", "", None, "", None, f"repeated {element.repeat} times:")
            yield from _rows(element.elements, f"{place}.", ends)
        elif isinstance(element, Layer):
            kind = "layer" if element.wires is None else "wire layer"
            eps = _pair(element.material, ends)
            detail = "" if element.wires is None else _wire_detail(element.wires)
            yield Row(place, kind, element.name, element.thickness, element.material.name, eps, detail)
        else:
            yield Row(place, *_sheet_words(element))


def _sheet_words(sheet: Patches | Strips | Film) -> tuple[str, str, None, str, None, str]:
    from slabsim.units import format_length

    if isinstance(sheet, Patches):
        detail = f"period {format_length(sheet.period)}, gap {format_length(sheet.gap)}"
        return "patches", sheet.name, None, "", None, detail
    if isinstance(sheet, Strips):
        detail = f"period {format_length(sheet.period)}, width {format_length(sheet.width)}"
        return "strips", sheet.name, None, "", None, detail
    if sheet.sheet_resistance is not None:
        return "film", sheet.name, None, "", None, f"{sheet.sheet_resistance:g} ohm per square"
    assert sheet.conductivity is not None
    assert sheet.thickness is not None
    resistance = 1.0 / (sheet.conductivity * sheet.thickness)
    return "film", sheet.name, None, "", None, f"{format_length(sheet.thickness)}: {resistance:.4g} ohm per square"


def _wire_detail(wires: WireSet) -> str:
    return f"ends {_end_word(wires.ends[0])}, {_end_word(wires.ends[1])}"


def _end_word(end: WireEnd) -> str:
    return end.kind if end.load is None else f"{end.kind} through a load"


def _pair(material: Material, ends: tuple[float, float]) -> tuple[complex, complex]:
    first, last = material.permittivity(np.array(ends))
    return complex(first), complex(last)


def _wire_numbers(layer: Layer, ends: tuple[float, float]) -> WireNumbers:
    assert layer.wires is not None
    wires, frequencies = layer.wires, np.array(ends)
    k0 = TWO_PI * frequencies / C0
    eps = layer.material.permittivity(frequencies)
    index = np.sqrt(np.maximum(eps.real, 0.0))
    kp, zeta = wire_constants(layer, wires, frequencies)
    tem = np.sqrt(k0**2 * eps * (1.0 + 1j * zeta * kp**2 / k0))
    loss = 20.0 / np.log(10.0) * tem.imag * layer.thickness
    impedance = skin = None
    if wires.metal is not None:
        metal = wires.metal.permittivity(frequencies)
        impedance = _two(internal_impedance(wires.radius, metal, frequencies, eps))
        skin = _two(1.0 / (k0 * np.sqrt(metal)).imag)
    return WireNumbers(
        layer=layer.name or "wire layer",
        wires=wires,
        fill_fraction=fill_fraction(wires.pitch, wires.radius),
        plasma=_plasma_values(layer, wires),
        pitch_over_wavelength=float(max(wires.pitch) * k0[1] * index[1] / (2.0 * pi)),
        thickness_over_wavelength=_two(layer.thickness * k0 * index / (2.0 * pi)),
        skin_depth=skin,
        impedance=impedance,
        local_eps=_two(local_permittivity(layer, wires, frequencies)),
        tem_loss_db=_two(loss),
    )


def _plasma_values(layer: Layer, wires: WireSet) -> tuple[PlasmaValue, ...]:
    formulas = [*FORMULAS] if isinstance(wires.plasma, str) else [*FORMULAS, wires.plasma]
    values = []
    for formula in formulas:
        is_used = formula == wires.plasma
        name = formula if isinstance(formula, str) else "given"
        try:
            kp = plasma_wavenumber(wires.pitch, wires.radius, formula, layer.material)
        except InputError:  # this formula has no solution for such thick wires; the one in use has
            continue
        values.append(PlasmaValue(name, kp, _plasma_frequency(kp, layer.material), is_used))
    return tuple(values)


def _plasma_frequency(kp: float, host: Material) -> float:
    """Frequency [Hz] with k0 sqrt(Re eps_host) = kp, by fixed-point steps; NaN where the host is not known."""
    from slabsim.errors import MaterialError

    f = kp * C0 / TWO_PI
    try:
        for _ in range(50):
            eps = float(host.permittivity(f).real)
            if not eps > 0.0:
                return float("nan")
            f = kp * C0 / TWO_PI / eps**0.5
    except MaterialError:
        return float("nan")
    return f


def _two(values: np.ndarray) -> tuple[Any, Any]:
    return values[0].item(), values[1].item()
