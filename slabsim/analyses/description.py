"""What was read from a stack file, with the derived numbers that a designer checks first."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from math import pi
from typing import Any

import numpy as np

from slabsim.constants import C0, TWO_PI
from slabsim.engine.diffraction import onset
from slabsim.engine.wire_numbers import cell_area, direction_of, local_permittivity, wire_constants, wire_numbers
from slabsim.errors import InputError
from slabsim.materials.material import Material
from slabsim.materials.mesh import stiffness
from slabsim.materials.wires import FORMULAS, internal_impedance, plasma_wavenumber
from slabsim.stack.sample import (
    Direction,
    Element,
    Grid,
    Group,
    Layer,
    Mesh,
    Patches,
    Plates,
    Sheet,
    Stack,
    Strips,
    WireEnd,
    WireSet,
)
from slabsim.units import format_frequency, format_length, format_spectral


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
    layer, title, direction : str
        Name of the layer; "Wires", "Wires 1", "Mesh"; along which axis they run.
    wires : WireSet or Mesh
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
    tem_loss_db : (float, float) or None
        Loss of the wires' TEM mode, host included, over one pass of the layer [dB], at kx = 0; None for wires that do
        not cross the layer.
    stiffness : float or None
        l0 of a mesh.
    """

    layer: str
    title: str
    direction: str
    wires: WireSet | Mesh
    fill_fraction: float
    plasma: tuple[PlasmaValue, ...]
    pitch_over_wavelength: float
    thickness_over_wavelength: tuple[float, float]
    skin_depth: tuple[float, float] | None
    impedance: tuple[complex, complex] | None
    local_eps: tuple[complex, complex]
    tem_loss_db: tuple[float, float] | None
    stiffness: float | None = None


@dataclass(frozen=True)
class Description:
    """A stack in numbers: its rows, its wire sets, the ends of its sweep; notes on what bounds the models."""

    stack: Stack
    rows: tuple[Row, ...]
    wires: tuple[WireNumbers, ...]
    frequencies: tuple[float, float]
    notes: tuple[str, ...] = ()


def describe_stack(stack: Stack) -> Description:
    """Rows and derived numbers of a stack, at the two ends of its sweep."""
    ends = (float(stack.sweep.frequencies[0]), float(stack.sweep.frequencies[-1]))
    rows = tuple(_rows(stack.elements, "", ends))
    distinct = dict.fromkeys(e for e in stack.flatten() if isinstance(e, Layer))
    wires = tuple(numbers for layer in distinct for numbers in _layer_numbers(layer, ends))
    return Description(stack, rows, wires, ends, tuple(_notes(stack)))


def _notes(stack: Stack) -> Iterator[str]:
    if any(isinstance(element, Grid | Plates) for element in stack.flatten()):
        sweep = stack.sweep
        angles = np.unique(sweep.angles_deg[[0, -1]])
        lowest = np.min([onset(stack, angles, float(azimuth)) for azimuth in sweep.azimuths_deg], axis=0)
        edges = [format_spectral(edge, sweep.spectral_unit) if np.isfinite(edge) else "no frequency" for edge in lowest]
        yield (
            f"Diffraction, or a second mode between plates, sets in at {' and '.join(edges)} "
            f"({' and '.join(f'{angle:g}' for angle in angles)} deg); beyond it the map holds NaN."
        )


def _rows(elements: tuple[Element, ...], prefix: str, ends: tuple[float, float]) -> Iterator[Row]:
    for number, element in enumerate(elements, start=1):
        place = f"{prefix}{number}"
        if isinstance(element, Group):
            yield Row(place, "group", "", None, "", None, f"repeated {element.repeat} times:")
            yield from _rows(element.elements, f"{place}.", ends)
        elif isinstance(element, Layer):
            kind = "wire layer" if element.wires else "mesh layer" if element.mesh else "layer"
            eps = _pair(element.material, ends)
            yield Row(place, kind, element.name, element.thickness, element.material.name, eps, _layer_detail(element))
        elif isinstance(element, Plates):
            eps = _pair(element.filling, ends)
            detail = _plates_detail(element, ends[-1])
            yield Row(place, "plates", element.name, element.thickness, element.filling.name, eps, detail)
        else:
            yield Row(place, *_sheet_words(element))


def _plates_detail(plates: Plates, frequency: float) -> str:
    index2 = float((plates.filling.permittivity(frequency) * plates.filling.permeability(frequency)).real)
    cut_off = format_frequency(C0 / (2.0 * plates.spacing * index2**0.5)) if index2 > 0.0 else "-"
    return f"normal to {plates.normal}, spacing {format_length(plates.spacing)}, cut-off {cut_off}"


def _sheet_words(sheet: Sheet) -> tuple[str, str, None, str, None, str]:
    if isinstance(sheet, Grid):
        metal = "perfect conductor" if sheet.metal is None else sheet.metal.name
        size = f"pitch {format_length(sheet.pitch)}, radius {format_length(sheet.radius)}"
        return "grid", sheet.name, None, metal, None, f"{_direction_words(sheet.direction)}, {size}"
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


def _layer_detail(layer: Layer) -> str:
    sets: list[WireSet | Mesh] = [*layer.wires, *([layer.mesh] if layer.mesh else [])]
    words = []
    for wires in sets:
        direction = "mesh" if isinstance(wires, Mesh) else _direction_words(wires.direction)
        ends = f", ends {_end_word(wires.ends[0])}, {_end_word(wires.ends[1])}"
        words.append(direction + (ends if direction_of(wires)[2] > 0.0 else ""))
    if not layer.material.is_isotropic:
        words.append("anisotropic, mean eps")
    if layer.rotation:
        words.append(f"turned by {np.rad2deg(layer.rotation):.6g} deg")
    return "; ".join(words)


def _direction_words(n: Direction) -> str:
    for name, axis in (("x", (1.0, 0.0, 0.0)), ("y", (0.0, 1.0, 0.0)), ("z", (0.0, 0.0, 1.0))):
        if n == axis:
            return f"along {name}"
    azimuth = f"azimuth {np.rad2deg(np.arctan2(n[1], n[0])):.6g} deg"
    return azimuth if n[2] == 0.0 else f"tilt {np.rad2deg(np.arccos(n[2])):.6g} deg, {azimuth}"


def _end_word(end: WireEnd) -> str:
    return end.kind if end.load is None else f"{end.kind} through a load"


def _pair(material: Material, ends: tuple[float, float]) -> tuple[complex, complex]:
    first, last = material.permittivity(np.array(ends))
    return complex(first), complex(last)


def _layer_numbers(layer: Layer, ends: tuple[float, float]) -> Iterator[WireNumbers]:
    for number, wires in enumerate(layer.wires, start=1):
        title = "Wires" if len(layer.wires) == 1 else f"Wires {number}"
        yield _wire_numbers(layer, wires, title, _direction_words(wires.direction), ends)
    if layer.mesh is not None:
        yield _wire_numbers(layer, layer.mesh, "Mesh", "along x, y and z, joined", ends)


def _wire_numbers(
    layer: Layer, wires: WireSet | Mesh, title: str, direction: str, ends: tuple[float, float]
) -> WireNumbers:
    frequencies = np.array(ends)
    k0 = TWO_PI * frequencies / C0
    eps = layer.material.permittivity(frequencies)
    index = np.sqrt(np.maximum(eps.real, 0.0))
    kp, _ = wire_constants(layer, wires, frequencies)
    impedance = skin = None
    if wires.metal is not None:
        metal = wires.metal.permittivity(frequencies)
        impedance = _two(internal_impedance(wires.radius, metal, frequencies, eps))
        skin = _two(1.0 / (k0 * np.sqrt(metal)).imag)
    l0 = None
    if isinstance(wires, Mesh):
        l0 = stiffness(wires.pitch, wires.radius, kp) if wires.stiffness is None else wires.stiffness
    pitch = wires.pitch if isinstance(wires, Mesh) else max(wires.pitch)
    return WireNumbers(
        layer=layer.name or "wire layer",
        title=title,
        direction=direction,
        wires=wires,
        fill_fraction=pi * wires.radius**2 / cell_area(wires) * (1 if l0 is None else 3),
        plasma=_plasma_values(layer, wires),
        pitch_over_wavelength=float(pitch * k0[1] * index[1] / (2.0 * pi)),
        thickness_over_wavelength=_two(layer.thickness * k0 * index / (2.0 * pi)),
        skin_depth=skin,
        impedance=impedance,
        local_eps=_two(local_permittivity(layer, wires, frequencies)),
        tem_loss_db=_tem_loss(layer, wires, k0, frequencies),
        stiffness=l0,
    )


def _tem_loss(
    layer: Layer, wires: WireSet | Mesh, k0: np.ndarray, frequencies: np.ndarray
) -> tuple[float, float] | None:
    n_z = direction_of(wires)[2]
    if n_z == 0.0 or isinstance(wires, Mesh):
        return None
    numbers = wire_numbers(layer, wires, frequencies)
    mode = np.sqrt(k0**2 * numbers.charge * (numbers.inductance + numbers.zc))
    return _two(20.0 / np.log(10.0) * abs(mode.imag) * layer.thickness / n_z)


def _plasma_values(layer: Layer, wires: WireSet | Mesh) -> tuple[PlasmaValue, ...]:
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
