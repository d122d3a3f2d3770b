"""From a checked stack to the plain arrays that the kernels take; the only place that knows both.

Everything that depends on frequency alone is computed here, with numpy, once per frequency.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from slabsim.constants import C0, ETA0, TWO_PI
from slabsim.engine import rows
from slabsim.engine.wire_numbers import cell_area, load_impedance, local_permittivity, wire_constants
from slabsim.materials.material import Material
from slabsim.materials.sheets import film_admittance, patch_admittance, strip_admittance
from slabsim.stack.sample import (
    Film,
    Grid,
    Layer,
    Model,
    Patches,
    Plates,
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
    metal_back : bool
    """

    kinds: np.ndarray
    rows: np.ndarray
    tables: np.ndarray
    media: np.ndarray
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
            assert not isinstance(element, Plates | Grid)  # `takes_scalar_path` sends those to the four-port engine
            packer.sheet(element, *neighbours(elements, position, stack))
        elif not element.wires:
            packer.plain(element)
        elif model == "local":
            packer.uniaxial(element, element.wires[0])
        else:
            behind = elements[position + 1] if position + 1 < len(elements) else None
            packer.wires(element, element.wires[0], behind)
    return packer.recipe()


def takes_scalar_path(stack: Stack) -> bool:
    """Whether TE and TM stay apart and the scalar kernels know every element; else the four-port engine solves it."""
    return all(_is_scalar(element) for element in dict.fromkeys(stack.flatten()))


def _is_scalar(element: Layer | Plates | Sheet) -> bool:
    if isinstance(element, Layer):
        has_normal_wires = len(element.wires) <= 1 and all(wires.is_normal for wires in element.wires)
        return element.material.is_isotropic and element.mesh is None and has_normal_wires
    return not isinstance(element, Plates | Grid)


def neighbours(elements: tuple[Layer | Plates | Sheet, ...], position: int, stack: Stack) -> tuple[Material, Material]:
    """Materials in front of and behind a sheet; a sheet on a conductor has the front one on both sides."""
    before = next((_medium_of(e) for e in reversed(elements[:position]) if isinstance(e, Layer | Plates)), stack.front)
    after = next((_medium_of(e) for e in elements[position + 1 :] if isinstance(e, Layer | Plates)), stack.back)
    return before, before if after is None else after


def _medium_of(element: Layer | Plates) -> Material:
    return element.material if isinstance(element, Layer) else element.filling


def sheet_admittance(
    sheet: Patches | Strips | Film, before: Material, after: Material, frequencies: np.ndarray
) -> tuple[np.ndarray, np.ndarray, int]:
    """y0 and 1/(2 ee) of a sheet between two media, shape (n_freqs,), and UNIFORM, PATCHES or STRIPS."""
    k0 = TWO_PI * frequencies / C0
    eps = before.permittivity(frequencies), after.permittivity(frequencies)
    if isinstance(sheet, Patches):
        y0, ee = patch_admittance(sheet.period, sheet.gap, k0, *eps)
        return y0, 0.5 / ee, rows.PATCHES
    if isinstance(sheet, Strips):
        y0, ee = strip_admittance(sheet.period, sheet.width, k0, *eps)
        return y0, 0.5 / ee, rows.STRIPS
    y0, ee = _film(sheet, *eps)
    return y0, 0.5 / ee, rows.UNIFORM


@dataclass
class _Packer:
    """Collects kernel elements back to front; equal elements share one table."""

    stack: Stack
    frequencies: np.ndarray
    kinds: list[int] = field(default_factory=list)
    rows: list[int] = field(default_factory=list)
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
            metal_back=self.stack.back is None,
        )

    def plain(self, layer: Layer) -> None:
        """A layer without wires."""
        key = ("plain", layer.material, layer.thickness)
        self._add(rows.PLAIN, key, lambda table: self._medium(table, layer))
        table = self.tables[self.rows[-1]]
        losses = table[[rows.EPS + 1, rows.MU + 1]]
        if not losses.any() and np.all(table[rows.EXCESS] >= 0.0):
            self.kinds[-1] = rows.TRANSPARENT

    def uniaxial(self, layer: Layer, wires: WireSet) -> None:
        """Wires in the local model: eps_zz = eps + i/(k0 xi)."""

        def fill(table: np.ndarray) -> None:
            eps, _ = self._medium(table, layer)
            eps_zz = local_permittivity(layer, wires, self.frequencies)
            with np.errstate(divide="ignore", invalid="ignore"):  # at a lossless plasma edge: NaN points
                _set(table, rows.STRETCH, 1.0 - eps / eps_zz)

        self._add(rows.UNIAXIAL, ("uniaxial", layer.material, layer.thickness, wires), fill)

    def wires(self, layer: Layer, wires: WireSet, behind: Layer | Plates | Sheet | None) -> None:
        """Wires in the nonlocal model: a port of its own, or a member of a run of joined layers."""
        front, back = wires.ends
        key = (layer.material, layer.thickness, wires)
        if front.kind != "joined" and back.kind != "joined":
            self._add(
                rows.WIRES,
                ("wires", *key),
                lambda table: self._set_ends(table, wires, self._wire_medium(table, layer, wires)),
            )
            return
        kp, _ = wire_constants(layer, wires, self.frequencies)
        if back.kind == "joined":
            assert isinstance(behind, Layer)
            neighbour, layer_behind = behind.wires[0], behind
            joint = ("joint", key, layer_behind.material, neighbour)
            self._add(
                rows.WIRE_JOINT,
                joint,
                lambda table: self._set_joint(table, kp, wires, layer_behind, neighbour),
            )
        else:
            self._add(
                rows.WIRE_BACK,
                ("back", *key),
                lambda table: self._set_end(table, kp, wires, back, 1.0),
            )
        self._add(rows.WIRE_RUN, ("run", *key), lambda table: self._wire_medium(table, layer, wires))
        if front.kind != "joined":
            self._add(
                rows.WIRE_FRONT,
                ("front", *key),
                lambda table: self._set_end(table, kp, wires, front, -1.0),
            )

    def sheet(self, sheet: Patches | Strips | Film, before: Material, after: Material) -> None:
        """A sheet of zero thickness between two media."""

        def fill(table: np.ndarray) -> None:
            y0, tilt, form = sheet_admittance(sheet, before, after, self.frequencies)
            _set(table, rows.Y_SHEET, y0)
            _set(table, rows.TILT, tilt)
            table[rows.FORM] = form

        self._add(rows.SHEET, ("sheet", sheet, before, after), fill)

    def _add(self, kind: int, key: object, fill: Callable[[np.ndarray], object]) -> None:
        if key not in self.known:
            table = np.zeros((rows.N_PARAMS, self.frequencies.size))
            fill(table)
            self.known[key] = len(self.tables)
            self.tables.append(table)
        self.kinds.append(kind)
        self.rows.append(self.known[key])

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
        if wires.inductance == "host":  # the inductance mu/kp^2 is that of 1/kp^2 with the rest counted as impedance
            zc = zc + layer.material.permeability(self.frequencies) - 1.0
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
        return kp**2 * load_impedance(load, self.frequencies) * cell_area(wires) / ETA0

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
