"""From a checked stack to the plain arrays that the kernels take; the only place that knows both.

Everything that depends on frequency alone is computed here, with numpy, once per frequency.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from slabsim.constants import C0, ETA0, TWO_PI
from slabsim.engine import rows
from slabsim.materials.material import Material
from slabsim.materials.sheets import film_admittance, patch_admittance, strip_admittance
from slabsim.materials.wires import internal_impedance, plasma_wavenumber
from slabsim.stack.sample import (
    Film,
    Layer,
    Model,
    Patches,
    SeriesLoad,
    Sheet,
    Stack,
    Strips,
    WireEnd,
    WireSet,
)


@dataclass(frozen=True)
class Recipe:
    """A stack at given frequencies, as the kernels take it.

    Attributes
    ----------
    kinds, rows : int64 arrays, shape (n_elements,)
        Kind of each kernel element, back to front, and its index in `tables`.
    tables : float array, shape (n_tables, N_PARAMS, n_freqs)
    media : float array, shape (N_MEDIA, n_freqs)
        Half-spaces.
    positions : tuple of int
        For each kernel element, which entry of ``stack.flatten()`` it belongs to (a run of joined wires
        takes several kernel elements).
    metal_back : bool
    """

    kinds: np.ndarray
    rows: np.ndarray
    tables: np.ndarray
    media: np.ndarray
    positions: tuple[int, ...]
    metal_back: bool


def pack(stack: Stack, model: Model, frequencies: np.ndarray) -> Recipe:
    """Lay out a stack for the kernels.

    Parameters
    ----------
    stack : Stack
    model : {"nonlocal", "local"}
        Of the wires.
    frequencies : float array, shape (n_freqs,)
        [Hz].

    Returns
    -------
    Recipe

    Raises
    ------
    MaterialError
        If a material is not known at one of the frequencies.
    """
    packer = _Packer(stack, np.asarray(frequencies, dtype=float))
    elements = stack.flatten()
    for position in reversed(range(len(elements))):
        element = elements[position]
        if not isinstance(element, Layer):
            packer.sheet(position, element, *_neighbours(elements, position, stack))
        elif element.wires is None:
            packer.plain(position, element)
        elif model == "local":
            packer.uniaxial(position, element, element.wires)
        else:
            behind = elements[position + 1] if position + 1 < len(elements) else None
            packer.wires(position, element, element.wires, behind)
    return packer.recipe()


def wire_constants(layer: Layer, wires: WireSet, frequencies: np.ndarray) -> tuple[float, np.ndarray]:
    """Plasma wavenumber kp [rad/m] of a wire set, and its zeta = Zw area / eta0 [m], shape (n_freqs,)."""
    kp = plasma_wavenumber(wires.pitch, wires.radius, wires.plasma, layer.material)
    if wires.metal is None:
        return kp, np.zeros(frequencies.shape, dtype=complex)
    metal, host = wires.metal.permittivity(frequencies), layer.material.permittivity(frequencies)
    area = wires.pitch[0] * wires.pitch[1]
    return kp, internal_impedance(wires.radius, metal, frequencies, host) * area / ETA0


def local_permittivity(layer: Layer, wires: WireSet, frequencies: np.ndarray) -> np.ndarray:
    """Permittivity along the wires in the local model, eps + i/(k0 xi), complex array of shape (n_freqs,).

    Zero at the plasma edge; where the wires are inductive by themselves that lies below the edge given by kp alone.
    """
    k0 = TWO_PI * frequencies / C0
    kp, zeta = wire_constants(layer, wires, frequencies)
    return layer.material.permittivity(frequencies) + 1j / (k0 * (zeta - 1j * k0 / kp**2))


def load_impedance(load: SeriesLoad, frequencies: np.ndarray) -> np.ndarray:
    """Impedance [ohm] of a series load; time factor exp(-i w t), so an inductance is -i w L."""
    w = TWO_PI * frequencies
    z = load.resistance - 1j * w * load.inductance
    return z if load.capacitance is None else z + 1j / (w * load.capacitance)


def _neighbours(elements: tuple[Layer | Sheet, ...], position: int, stack: Stack) -> tuple[Material, Material]:
    """Materials in front of and behind a sheet; a sheet on a conductor has the front one on both sides."""
    before = next((e.material for e in reversed(elements[:position]) if isinstance(e, Layer)), stack.front)
    after = next((e.material for e in elements[position + 1 :] if isinstance(e, Layer)), stack.back)
    return before, before if after is None else after


@dataclass
class _Packer:
    """Collects kernel elements back to front; equal elements share one table."""

    stack: Stack
    frequencies: np.ndarray
    kinds: list[int] = field(default_factory=list)
    rows: list[int] = field(default_factory=list)
    positions: list[int] = field(default_factory=list)
    tables: list[np.ndarray] = field(default_factory=list)
    known: dict[object, int] = field(default_factory=dict)

    def __post_init__(self) -> None:
        self.k0 = TWO_PI * self.frequencies / C0
        self.front_eps = self.stack.front.permittivity(self.frequencies).real
        self.front_mu = self.stack.front.permeability(self.frequencies).real

    def recipe(self) -> Recipe:
        """What has been collected, as arrays."""
        media = np.zeros((rows.N_MEDIA, self.frequencies.size))
        media[rows.FRONT_EPS], media[rows.FRONT_MU] = self.front_eps, self.front_mu
        back = self.stack.back if self.stack.back is not None else self.stack.front
        eps, mu = back.permittivity(self.frequencies), back.permeability(self.frequencies)
        _set(media, rows.BACK_EPS, eps)
        _set(media, rows.BACK_MU, mu)
        _set(media, rows.E_OVER_H, np.sqrt(self.front_eps / self.front_mu) / np.sqrt(eps / mu))
        empty = np.zeros((0, rows.N_PARAMS, self.frequencies.size))
        return Recipe(
            kinds=np.array(self.kinds, dtype=np.int64),
            rows=np.array(self.rows, dtype=np.int64),
            tables=np.stack(self.tables) if self.tables else empty,
            media=media,
            positions=tuple(self.positions),
            metal_back=self.stack.back is None,
        )

    def plain(self, position: int, layer: Layer) -> None:
        """A layer without wires."""
        key = ("plain", layer.material, layer.thickness)
        self._add(position, rows.PLAIN, key, lambda table: self._medium(table, layer))
        table = self.tables[self.rows[-1]]
        losses = table[[rows.EPS + 1, rows.MU + 1]]
        if not losses.any() and np.all(table[rows.EXCESS] >= 0.0):
            self.kinds[-1] = rows.TRANSPARENT

    def uniaxial(self, position: int, layer: Layer, wires: WireSet) -> None:
        """Wires in the local model: eps_zz = eps + i/(k0 xi)."""

        def fill(table: np.ndarray) -> None:
            eps, _ = self._medium(table, layer)
            eps_zz = local_permittivity(layer, wires, self.frequencies)
            with np.errstate(divide="ignore", invalid="ignore"):  # at a lossless plasma edge: NaN points
                _set(table, rows.STRETCH, 1.0 - eps / eps_zz)

        self._add(position, rows.UNIAXIAL, ("uniaxial", layer.material, layer.thickness, wires), fill)

    def wires(self, position: int, layer: Layer, wires: WireSet, behind: Layer | Sheet | None) -> None:
        """Wires in the nonlocal model: a port of its own, or a member of a run of joined layers."""
        front, back = wires.ends
        key = (layer.material, layer.thickness, wires)
        if front.kind != "joined" and back.kind != "joined":
            self._add(
                position,
                rows.WIRES,
                ("wires", *key),
                lambda table: self._set_ends(table, wires, self._wire_medium(table, layer, wires)),
            )
            return
        kp, _ = wire_constants(layer, wires, self.frequencies)
        if back.kind == "joined":
            assert isinstance(behind, Layer)
            assert behind.wires is not None
            neighbour, layer_behind = behind.wires, behind
            joint = ("joint", key, layer_behind.material, neighbour)
            self._add(
                position,
                rows.WIRE_JOINT,
                joint,
                lambda table: self._set_joint(table, kp, wires, layer_behind, neighbour),
            )
        else:
            self._add(
                position,
                rows.WIRE_BACK,
                ("back", *key),
                lambda table: self._set_end(table, kp, wires, back, 1.0),
            )
        self._add(position, rows.WIRE_RUN, ("run", *key), lambda table: self._wire_medium(table, layer, wires))
        if front.kind != "joined":
            self._add(
                position,
                rows.WIRE_FRONT,
                ("front", *key),
                lambda table: self._set_end(table, kp, wires, front, -1.0),
            )

    def sheet(self, position: int, sheet: Sheet, before: Material, after: Material) -> None:
        """A sheet of zero thickness between two media."""

        def fill(table: np.ndarray) -> None:
            eps = before.permittivity(self.frequencies), after.permittivity(self.frequencies)
            if isinstance(sheet, Patches):
                y0, ee = patch_admittance(sheet.period, sheet.gap, self.k0, *eps)
                form = rows.PATCHES
            elif isinstance(sheet, Strips):
                y0, ee = strip_admittance(sheet.period, sheet.width, self.k0, *eps)
                form = rows.STRIPS
            else:
                y0, ee = _film(sheet, *eps)
                form = rows.UNIFORM
            _set(table, rows.Y_SHEET, y0)
            _set(table, rows.TILT, 0.5 / ee)
            table[rows.FORM] = form

        self._add(position, rows.SHEET, ("sheet", sheet, before, after), fill)

    def _add(self, position: int, kind: int, key: object, fill: Callable[[np.ndarray], object]) -> None:
        if key not in self.known:
            table = np.zeros((rows.N_PARAMS, self.frequencies.size))
            fill(table)
            self.known[key] = len(self.tables)
            self.tables.append(table)
        self.kinds.append(kind)
        self.rows.append(self.known[key])
        self.positions.append(position)

    def _medium(self, table: np.ndarray, layer: Layer) -> tuple[np.ndarray, np.ndarray]:
        eps = layer.material.permittivity(self.frequencies)
        mu = layer.material.permeability(self.frequencies)
        table[rows.DEPTH] = self.k0 * layer.thickness
        for row, value in ((rows.EPS, eps), (rows.INV_EPS, 1.0 / eps), (rows.MU, mu), (rows.INV_MU, 1.0 / mu)):
            _set(table, row, value)
        _set(table, rows.EXCESS, eps * mu - self.front_eps * self.front_mu)
        return eps, mu

    def _wire_medium(self, table: np.ndarray, layer: Layer, wires: WireSet) -> float:
        eps, _ = self._medium(table, layer)
        kp, zeta = wire_constants(layer, wires, self.frequencies)
        table[rows.KP2], table[rows.KP] = (kp / self.k0) ** 2, kp / self.k0
        zc = 1j * zeta * kp**2 / self.k0
        _set(table, rows.ZC, zc)
        _set(table, rows.X_WIRE, (kp / self.k0) ** 2 - eps * zc)
        if wires.metal is None and not layer.material.is_magnetic:
            self._set_tem(table, eps)
        return kp

    def _set_tem(self, table: np.ndarray, eps: np.ndarray) -> None:
        """p, c, g of the TEM mode, as `vector_math.wave` defines them."""
        kappa = np.sqrt(eps)
        twice = 2j * kappa * table[rows.DEPTH]
        _set(table, rows.TEM, np.exp(0.5 * twice))
        _set(table, rows.TEM + 2, 0.5 * (1.0 + np.exp(twice)))
        _set(table, rows.TEM + 4, -np.expm1(twice) / (2.0 * kappa))
        table[rows.IDEAL] = 1.0

    def _end(self, kp: float, wires: WireSet, end: WireEnd, side: float) -> tuple[np.ndarray, np.ndarray]:
        """(nu, omega) of an end: (v, psi) there is a multiple of it. `side`: -1 front, +1 back."""
        one = np.ones(self.frequencies.shape, dtype=complex)
        if end.kind == "open":
            return 0.0 * one, one
        if end.load is None:
            return one, 0.0 * one
        y = self._load(kp, wires, end.load)
        scale = 1.0 / (1.0 + abs(y))
        return scale * one, side * scale * y

    def _load(self, kp: float, wires: WireSet, load: SeriesLoad) -> np.ndarray:
        area = wires.pitch[0] * wires.pitch[1]
        return kp**2 * load_impedance(load, self.frequencies) * area / ETA0

    def _set_end(self, table: np.ndarray, kp: float, wires: WireSet, end: WireEnd, side: float) -> None:
        nu, omega = self._end(kp, wires, end, side)
        _set(table, rows.NU, nu)
        _set(table, rows.OMEGA, omega)

    def _set_ends(self, table: np.ndarray, wires: WireSet, kp: float) -> None:
        nu_front, omega_front = self._end(kp, wires, wires.ends[0], -1.0)
        nu_back, omega_back = self._end(kp, wires, wires.ends[1], 1.0)
        _set(table, rows.END_PP, omega_front * omega_back)
        _set(table, rows.END_PF, omega_front * nu_back)
        _set(table, rows.END_FP, nu_front * omega_back)
        _set(table, rows.END_FF, nu_front * nu_back)

    def _set_joint(self, table: np.ndarray, kp: float, wires: WireSet, behind: Layer, beyond: WireSet) -> None:
        kp_behind, _ = wire_constants(behind, beyond, self.frequencies)
        table[rows.RATIO] = kp_behind / kp
        loads = (wires.ends[1].load, beyond.ends[0].load)
        total = sum((self._load(kp, wires, load) for load in loads if load is not None), start=np.zeros(()))
        _set(table, rows.LOAD, total)


def _film(film: Film, eps_before: np.ndarray, eps_after: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    return film_admittance(film.sheet_resistance, film.conductivity, film.thickness, eps_before, eps_after)


def _set(table: np.ndarray, row: int, value: np.ndarray) -> None:
    table[row], table[row + 1] = value.real, value.imag
