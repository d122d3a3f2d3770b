"""A stack written twice: as slabsim's own model, and as plain numbers for the dense reference.

The second takes every derived quantity (kp, zeta, sheet admittances) from `tests/reference`.
"""

from dataclasses import dataclass, replace

import mpmath as mp
import numpy as np

from slabsim.materials.dispersion import Constant, Drude, ResonantPermeability
from slabsim.materials.material import VACUUM, Material
from slabsim.stack.sample import (
    Element,
    Film,
    Layer,
    Patches,
    SeriesLoad,
    Sheet,
    Stack,
    Strips,
    Sweep,
    WireEnd,
    WireSet,
)
from tests.reference import dense, lattice, sheets

OPEN, GROUNDED, JOINED = WireEnd("open"), WireEnd("grounded"), WireEnd("joined")
C0 = 299_792_458


def medium(eps: complex, mu: complex = 1.0, name: str = "medium") -> Material:
    """Material of constant eps and mu, loss included."""
    magnetic = None if mu == 1.0 else Fixed(complex(mu))
    return Material(name, Fixed(complex(eps)), magnetic)


@dataclass(frozen=True)
class Fixed:
    """The same value at every frequency."""

    value: complex

    def __call__(self, frequency):
        return np.full(np.shape(frequency), self.value)


def wires(pitch=10e-3, radius=0.5e-3, metal=None, front=OPEN, back=OPEN, plasma="lattice", **more) -> tuple[WireSet]:
    """The wires of a layer with one set, on a square or rectangular cell."""
    cell = pitch if isinstance(pitch, tuple) else (pitch, pitch)
    return (WireSet(cell, radius, metal, (front, back), plasma, **more),)


def stack(*elements: Element, front: Material = VACUUM, back: Material | None = VACUUM, **sweep) -> Stack:
    """Stack with a sweep of one point unless told otherwise."""
    grid = {"frequencies": np.array([1e9]), "angles_deg": np.array([0.0]), "azimuths_deg": np.array([0.0])}
    return Stack("test", front, back, elements, Sweep(**(grid | sweep)))


def reference(sample: Stack, frequency: float, angle_deg: float, polarization: str, model: str = "nonlocal"):
    """The dense solution of the same stack at one point."""
    k0 = 2 * mp.pi * mp.mpf(frequency) / C0
    front = _half_space(sample.front, frequency)
    back = "perfect conductor" if sample.back is None else _half_space(sample.back, frequency)
    theta = mp.mpf(angle_deg) * mp.pi / 180
    sin_air = mp.sqrt(front.eps * front.mu) * mp.sin(theta)
    flat = sample.flatten()
    elements = [_element(flat, i, sample, frequency, k0, sin_air) for i in range(len(flat))]
    return dense.solve(front, elements, back, k0, theta, polarization, model)


def _values(material: Material, frequency: float) -> tuple[complex, complex]:
    return complex(material.permittivity(frequency)), complex(material.permeability(frequency))


def _half_space(material: Material, frequency: float) -> dense.HalfSpace:
    eps, mu = _values(material, frequency)
    return dense.HalfSpace(eps, mu) if eps.imag or mu.imag else dense.HalfSpace(eps.real, mu.real)


def _element(flat, i: int, sample: Stack, frequency: float, k0, sin_air):
    element = flat[i]
    if isinstance(element, Layer):
        eps, mu = _values(element.material, frequency)
        array = None if not element.wires else _array(element.wires[0], eps, frequency, k0)
        return dense.Slab(eps, mu, element.thickness, array)
    return _sheet(element, *_sides(flat, i, sample, frequency), k0, sin_air)


def _sides(flat, i: int, sample: Stack, frequency: float) -> tuple[complex, complex]:
    before = [e.material for e in flat[:i] if isinstance(e, Layer)]
    after = [e.material for e in flat[i + 1 :] if isinstance(e, Layer)]
    first = before[-1] if before else sample.front
    second = after[0] if after else (sample.back or first)
    return _values(first, frequency)[0], _values(second, frequency)[0]


def _sheet(element: Sheet, eps_before: complex, eps_after: complex, k0, sin_air):
    if isinstance(element, Patches):
        return sheets.patches(k0, sin_air, element.period, element.gap, eps_before, eps_after)
    if isinstance(element, Strips):
        return sheets.strips(k0, sin_air, element.period, element.width, eps_before, eps_after)
    if element.sheet_resistance is not None:
        return sheets.resistive_film(element.sheet_resistance)
    return sheets.metal_film(element.conductivity, element.thickness)


def _array(array: WireSet, eps_host: complex, frequency: float, k0) -> dense.WireArray:
    p, q = array.pitch
    formula = array.plasma
    if formula == "lattice":
        kp = lattice.kp_lattice(p, q, array.radius)
    elif formula in ("logarithmic", "gap"):
        kp = {"logarithmic": lattice.kp_logarithmic, "gap": lattice.kp_gap}[formula](
            mp.sqrt(mp.mpf(p) * q), array.radius
        )
    else:
        kp = 2 * mp.pi * mp.mpf(formula) * mp.sqrt(eps_host.real) / C0
    zeta = 0
    if array.metal is not None:
        metal = _values(array.metal, frequency)[0]
        impedance = lattice.round_wire_impedance(metal, array.radius, k0, eps_host)
        zeta = lattice.zeta(impedance, mp.mpf(p) * q)
    ends = [_end(end, mp.mpf(p) * q, frequency) for end in array.ends]
    return dense.WireArray(kp, zeta, *ends)


def _end(end: WireEnd, area, frequency: float):
    if end.kind == "open":
        return dense.Open()
    load = 0 if end.load is None else _impedance(end.load, frequency) * area / lattice.ETA0
    return dense.Grounded(load) if end.kind == "grounded" else dense.Joined(load)


def _impedance(load: SeriesLoad, frequency: float):
    w = 2 * mp.pi * mp.mpf(frequency)
    z = load.resistance - 1j * w * load.inductance
    return z if load.capacitance is None else z + 1j / (w * load.capacitance)


# --- random stacks -----------------------------------------------------------------------------------


def random_stack(rng: np.random.Generator, lossless: bool = False) -> tuple[Stack, float, float]:
    """A stack of one to five elements of every kind, with a frequency [Hz] and an angle [degrees]."""
    frequency = 10 ** rng.uniform(9, 10.5)
    wavelength = C0 / frequency
    n_layers = int(rng.integers(1, 5))
    layers = [_random_layer(rng, wavelength, lossless) for _ in range(n_layers)]
    joints = [rng.random() < 0.5 for _ in range(n_layers - 1)]
    back = None if rng.random() < 0.25 else medium(rng.uniform(1, 4) + (0 if lossless else 1j * rng.choice([0, 0.1])))
    elements = _dress(rng, layers, joints, back is None, wavelength, lossless)
    front = VACUUM if rng.random() < 0.5 else medium(rng.uniform(1, 3), rng.choice([1.0, 1.5]))
    angle = float(rng.choice([0.0, rng.uniform(0, 89), 89.999], p=[0.1, 0.8, 0.1]))
    return stack(*elements, front=front, back=back), frequency, angle


def _random_medium(rng: np.random.Generator, lossless: bool) -> Material:
    kind = rng.integers(5)
    loss = 0.0 if lossless else 10 ** rng.uniform(-5, 0)
    if kind == 0:
        return medium(complex(-rng.uniform(0.5, 20), loss))  # below a plasma edge
    if kind == 1:
        return medium(complex(rng.uniform(1, 5), loss), complex(rng.uniform(0.5, 2), 0.1 * loss))
    if kind == 2:
        return medium(complex(-rng.uniform(0.5, 3), loss), complex(-rng.uniform(0.5, 2), 0.1 * loss))  # backward wave
    return medium(complex(rng.uniform(1, 12), loss * rng.choice([0, 1])))


def _random_layer(rng: np.random.Generator, wavelength: float, lossless: bool) -> Layer:
    thickness = wavelength * 10 ** rng.uniform(*[(-1.5, 0.3), (-5, -2), (0.3, 1.5)][rng.choice(3, p=[0.75, 0.15, 0.1])])
    array = ()
    if rng.random() < 0.65:
        pitch = wavelength * 10 ** rng.uniform(-2, -0.3)
        cell = (pitch, pitch) if rng.random() < 0.6 else (pitch, pitch * rng.uniform(0.4, 2.5))
        metal = None if lossless or rng.random() < 0.4 else _random_metal(rng, wavelength)
        formula = str(rng.choice(["lattice", "logarithmic", "gap"]))
        thickness = min(thickness, 300 * pitch)  # decays of up to about exp(-1000)
        array = (WireSet(cell, min(cell) * 10 ** rng.uniform(-3, -0.8), metal, (OPEN, OPEN), formula),)
    return Layer("layer", _random_medium(rng, lossless), thickness, array)


def _random_metal(rng: np.random.Generator, wavelength: float) -> Material:
    if rng.random() < 0.5:
        return Material("metal", Constant(1.0, 0.0, 10 ** rng.uniform(1, 8)))
    plasma = C0 / wavelength * 10 ** rng.uniform(0.5, 2)
    return Material("metal", Drude(plasma, plasma * 10 ** rng.uniform(-3, -1), 1.0))


def _dress(rng, layers, joints, metal_back, wavelength, lossless):
    """Ends of the wires and sheets between the layers, such that every end finds what it needs."""
    elements: list[Element] = []
    ends: list[list[WireEnd]] = [[OPEN, OPEN] for _ in layers]
    sheets_before: list[Element | None] = []
    for i in range(len(layers) + 1):
        meets = 0 < i < len(layers) and layers[i - 1].has_wires and layers[i].has_wires
        if meets and joints[i - 1]:
            array = layers[i].wires[0]
            radius = min(array.radius, 0.15 * min(layers[i - 1].wires[0].pitch))
            layers[i] = replace(layers[i], wires=(replace(array, pitch=layers[i - 1].wires[0].pitch, radius=radius),))
            ends[i - 1][1] = JOINED if rng.random() < 0.7 else WireEnd("joined", _random_load(rng, lossless))
            ends[i][0] = JOINED
            sheets_before.append(None)
            continue
        sheet = _random_sheet(rng, wavelength, lossless) if rng.random() < 0.4 else None
        sheets_before.append(sheet)
        conductor = isinstance(sheet, Patches | Film) or (i == len(layers) and metal_back)
        for layer, side in ((i - 1, 1), (i, 0)):
            if conductor and 0 <= layer < len(layers) and rng.random() < 0.7:
                ends[layer][side] = GROUNDED if rng.random() < 0.5 else WireEnd("grounded", _random_load(rng, lossless))
    for i, layer in enumerate(layers):
        if sheets_before[i] is not None:
            elements.append(sheets_before[i])
        elements.append(replace(layer, wires=tuple(replace(array, ends=tuple(ends[i])) for array in layer.wires)))
    if sheets_before[-1] is not None:
        elements.append(sheets_before[-1])
    return elements


def _random_load(rng: np.random.Generator, lossless: bool) -> SeriesLoad:
    resistance = 0.0 if lossless else 10 ** rng.uniform(0, 4)
    return SeriesLoad(resistance, 10 ** rng.uniform(-11, -8), rng.choice([None, 10 ** rng.uniform(-15, -12)]))


def _random_sheet(rng: np.random.Generator, wavelength: float, lossless: bool) -> Element:
    period = wavelength * rng.uniform(0.01, 0.2)
    kind = rng.integers(2 if lossless else 4)
    if kind == 0:
        return Patches("patches", period, period * rng.uniform(0.02, 0.5))
    if kind == 1:
        return Strips("strips", period, period * rng.uniform(0.02, 0.5))
    if kind == 2:
        return Film("film", 10 ** rng.uniform(0, 4))
    return Film("film", None, 10 ** rng.uniform(4, 7), 10 ** rng.uniform(-9, -7))


def resonant_host(resonance: float) -> Material:
    """A magnetic host with a resonance at `resonance` [Hz]."""
    return Material("rings", Constant(2.2), ResonantPermeability(resonance, 0.3, 0.01 * resonance))
