"""From a checked stack to the plain arrays of the four-port kernels, at one azimuth.

The axes of the sample are turned into the plane of incidence: p along it, s across it, z into the stack. Entries of
the generator that depend on the angle do so through s = kt/k0 and q^2 = (front index)^2 - s^2, the latter carrying the
digits at grazing incidence.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from slabsim.constants import C0, ETA0, TWO_PI
from slabsim.engine import port_rows as rows
from slabsim.engine.generators import Generator, layer_generator, turned
from slabsim.engine.pack import neighbours, sheet_admittance
from slabsim.engine.point_rows import grid_impedances, plate_ports
from slabsim.engine.rows import LANES
from slabsim.engine.wire_numbers import WireNumbers, direction_of, load_impedance
from slabsim.materials.material import Material
from slabsim.stack.sample import Direction, Grid, Layer, Mesh, Model, Plates, SeriesLoad, Sheet, Stack, WireEnd, WireSet

_MILD = 5.0  # admittance, or its inverse, up to which a reference admittance of 1 serves
_SAME = 1e-9  # components of two unit vectors that differ by less are equal


@dataclass(frozen=True)
class PortRecipe:
    """A stack at given frequencies, angles and one azimuth, as the four-port kernels take it.

    Attributes
    ----------
    elements, terms, ends : int64 arrays, shapes (n_elements, N_COLUMNS), (n_terms, 4), (n_ends, 4)
    table : float array, shape (n_rows, n_freqs + LANES)
    points : float array, shape (n_point_rows, n_freqs, n_angles)
    media : float array, shape (N_MEDIA, n_freqs)
    positions : tuple of int
        For each element, the entry of ``stack.flatten()`` it belongs to.
    scales : tuple of float arrays, shape (n_freqs,)
        Reference admittance of each element.
    references : tuple of tuple of float arrays, shape (n_freqs,)
        Reference kp [rad/m] of the extra ports of each element.
    n_ports : int
        Most ports of an element.
    metal_back : bool
    diffracts : bool array, shape (2, n_freqs, n_angles)
        Points of TE and of TM where a grid or plates send out more than one order.
    """

    elements: np.ndarray
    terms: np.ndarray
    ends: np.ndarray
    table: np.ndarray
    points: np.ndarray
    media: np.ndarray
    positions: tuple[int, ...]
    scales: tuple[np.ndarray, ...]
    references: tuple[tuple[np.ndarray, ...], ...]
    n_ports: int
    metal_back: bool
    diffracts: np.ndarray

    @property
    def arrays(self) -> tuple[np.ndarray, ...]:
        """What the kernels take first."""
        return self.elements, self.terms, self.ends, self.table, self.points, self.media


def pack_ports(
    stack: Stack, model: Model, frequencies: np.ndarray, angles_deg: np.ndarray, azimuth_deg: float
) -> PortRecipe:
    """Lay out a stack for the four-port kernels.

    Parameters
    ----------
    stack : Stack
    model : {"nonlocal", "local"}
        Of the wires.
    frequencies, angles_deg : float arrays, shapes (n_freqs,), (n_angles,)
        [Hz], [degrees]; the angles matter for grids and plates only.
    azimuth_deg : float
        Of the plane of incidence [degrees].

    Raises
    ------
    MaterialError
        If a material is not known at one of the frequencies.
    InputError
        If there are plates and the azimuth is no multiple of 90 degrees.
    """
    packer = _Packer(stack, model == "local", frequencies, angles_deg, azimuth_deg)
    elements = stack.flatten()
    for position in reversed(range(len(elements))):
        element = elements[position]
        packer.position = position
        if isinstance(element, Layer):
            packer.layer(element)
        elif isinstance(element, Plates):
            packer.plates(element)
        else:
            packer.sheet(element, *neighbours(elements, position, stack))
    return packer.recipe()


@dataclass
class _Port:
    """A port of wires that goes on from one layer to the next."""

    direction: Direction
    cell: tuple[float, float]
    reference: np.ndarray
    load: SeriesLoad | None


@dataclass
class _Packer:
    """Collects elements back to front; equal layers share their part of the table."""

    stack: Stack
    is_local: bool
    frequencies: np.ndarray
    angles_deg: np.ndarray
    azimuth_deg: float
    position: int = 0
    elements: list[list[int]] = field(default_factory=list)
    positions: list[int] = field(default_factory=list)
    scales: list[np.ndarray] = field(default_factory=list)
    references: list[tuple[np.ndarray, ...]] = field(default_factory=list)
    terms: list[tuple[int, int, int, int]] = field(default_factory=list)
    ends: list[tuple[int, int, int, int]] = field(default_factory=list)
    table: list[np.ndarray] = field(default_factory=list)
    points: list[np.ndarray] = field(default_factory=list)
    known: dict[object, tuple[int, int, np.ndarray]] = field(default_factory=dict)
    state: list[_Port] = field(default_factory=list)

    def __post_init__(self) -> None:
        self.k0 = TWO_PI * self.frequencies / C0
        self.azimuth = float(np.deg2rad(self.azimuth_deg))
        front = self.stack.front
        self.front = front.permittivity(self.frequencies).real, front.permeability(self.frequencies).real
        self.diffracts = np.zeros((2, self.frequencies.size, self.angles_deg.size), dtype=bool)
        self.y = self.back_y = self.reference(self.stack.back or front)

    def recipe(self) -> PortRecipe:
        """What has been collected, as arrays."""
        back = self.stack.back or self.stack.front
        eps, mu = back.permittivity(self.frequencies), back.permeability(self.frequencies)
        media = np.array([*self.front, eps.real, eps.imag, mu.real, mu.imag, self.y, self.back_y])
        shape = self.frequencies.size, self.angles_deg.size
        table = np.array(self.table) if self.table else np.zeros((0, self.frequencies.size))
        last = table[:, -1:]
        return PortRecipe(
            elements=_integers(self.elements, rows.N_COLUMNS),
            terms=_integers(self.terms, 4),
            ends=_integers(self.ends, 4),
            table=np.ascontiguousarray(np.hstack([table, np.repeat(last, LANES, axis=1)])),
            points=np.array(self.points) if self.points else np.zeros((0, *shape)),
            media=media,
            positions=tuple(self.positions),
            scales=tuple(self.scales),
            references=tuple(self.references),
            n_ports=max([2, *(one[rows.N_PORTS] for one in self.elements)]),
            metal_back=self.stack.back is None,
            diffracts=self.diffracts,
        )

    def layer(self, layer: Layer) -> None:
        """A layer, with or without wires."""
        key = None
        if not self.state and not any(end.kind == "joined" for wires in _crossing(layer) for end in wires.ends):
            key = ("layer", layer.material, layer.thickness, layer.wires, layer.mesh, layer.rotation)
        if self.repeat(key):
            return
        behind = [] if self.is_local else self.match(layer)
        lookup = {id(wires): port for wires, port in behind}
        reference = self.reference(layer.material)

        def joined(wires: WireSet | Mesh) -> np.ndarray | None:
            port = lookup.get(id(wires))
            return None if port is None else self.state[port].reference

        found = layer_generator(
            layer, self.is_local, self.frequencies, self.front[0] * self.front[1], self.azimuth, joined
        )
        self.add_loads(behind)
        self.rescale(reference)
        element = self.new(found.kind, n_ports=found.n_ports)
        self.row(self.k0 * layer.thickness)
        self.add_terms(element, found)
        self.add_ends(element, layer, found, lookup)
        self.keep(key)

    def add_terms(self, element: list[int], found: Generator) -> None:
        """Rows and entries of a generator; a reference admittance y multiplies A and divides B."""
        scales = {rows.BLOCK_A: self.y, rows.BLOCK_B: 1.0 / self.y, rows.BLOCK_D: np.ones(self.y.shape)}
        element[rows.FIRST_TERM], element[rows.N_TERMS] = len(self.terms), len(found.terms)
        for block, entry, multiplier, values in found.terms:
            self.terms.append((block, entry, multiplier, self.offset(element)))
            self.complex_row(values * scales[block])
        element[rows.FIRST_RESONANCE], element[rows.N_RESONANCES] = self.offset(element), len(found.resonances)
        for constant, slope in found.resonances:
            self.complex_row(constant)
            self.complex_row(slope)

    def add_ends(self, element: list[int], layer: Layer, found: Generator, lookup: dict[int, int]) -> None:
        """What the wires of a layer end on, and which of them go on in front."""
        element[rows.FIRST_END] = len(self.ends)
        self.references[-1] = tuple(reference for _, _, reference in found.crossing)
        state = []
        for wires, numbers, reference in found.crossing:
            n_z = direction_of(wires)[2]
            front, back = wires.ends
            behind = 2 + lookup[id(wires)] if id(wires) in lookup else rows.OWN
            is_kept = front.kind == "joined"
            at = self.offset(element)
            for end in (back, front):
                self.complex_row(self.rho(end, numbers, reference, n_z))
            self.ends.append((behind, int(is_kept), at, at + 2))
            if is_kept:
                direction = turned(direction_of(wires), layer.rotation, 0.0)
                cell = wires.pitch if isinstance(wires, WireSet) else (wires.pitch, wires.pitch)
                state.append(_Port(direction, cell, reference, front.load))
        self.state = state

    def rho(self, end: WireEnd, numbers: WireNumbers, reference: np.ndarray, n_z: float) -> np.ndarray:
        """Reflection coefficient of what a wire ends on; that of a joint is not used."""
        one = np.ones(self.frequencies.shape, dtype=complex)
        if end.kind != "grounded":
            return one
        if end.load is None:
            return -one
        z = self.y * self.load(end.load, numbers.area, reference, n_z)
        return (z - 1.0) / (z + 1.0)

    def load(self, load: SeriesLoad, area: float, reference: np.ndarray, n_z: float) -> np.ndarray:
        """psi/V of a load at a wire end, not scaled by y."""
        return reference**2 * load_impedance(load, self.frequencies) * area / (ETA0 * n_z)

    def match(self, layer: Layer) -> list[tuple[WireSet | Mesh, int]]:
        """Which port of the state each set of a layer continues in, by direction and cell."""
        free = list(range(len(self.state)))
        found: list[tuple[WireSet | Mesh, int]] = []
        for wires in _crossing(layer):
            if wires.ends[1].kind != "joined":
                continue
            direction = turned(direction_of(wires), layer.rotation, 0.0)
            cell = wires.pitch if isinstance(wires, WireSet) else (wires.pitch, wires.pitch)
            for port in free:
                other = self.state[port]
                gap = max(abs(a - b) for a, b in zip(direction, other.direction, strict=True))
                if gap < _SAME and other.cell == cell:
                    found.append((wires, port))
                    free.remove(port)
                    break
        return found

    def add_loads(self, behind: list[tuple[WireSet | Mesh, int]]) -> None:
        """Loads in series in the joints between a layer and the state."""
        for wires, port in behind:
            loads = [load for load in (wires.ends[1].load, self.state[port].load) if load is not None]
            if loads:
                element = self.new(rows.SERIES)
                element[rows.PORT] = 2 + port
                cell, n_z = self.state[port].cell, direction_of(wires)[2]
                total = sum(self.load(load, cell[0] * cell[1], self.state[port].reference, n_z) for load in loads)
                self.complex_row(0.5 * self.y * total)

    def sheet(self, sheet: Sheet, before: Material, after: Material) -> None:
        """A sheet of zero thickness between two media."""
        key = ("sheet", sheet, before, after)
        if self.repeat(key):
            return
        if isinstance(sheet, Grid):
            element = self.new(rows.GRID)
            element[rows.POINT_ROW] = len(self.points)
            z, marks = grid_impedances(sheet, before, after, self.stack.front, *self.grid)
            self.diffracts |= marks
            self.point_rows(z * self.y[:, None])
            n = turned(sheet.direction, 0.0, self.azimuth)
            for weight in (n[0] ** 2, n[0] * n[1], n[1] ** 2):
                self.row(np.full(self.k0.shape, 0.5 * weight))
            self.keep(key)
            return
        y0, tilt, form = sheet_admittance(sheet, before, after, self.frequencies)
        self.new(rows.SHEET)
        self.complex_row(y0 / self.y)
        self.complex_row(tilt)
        self.row(np.full(self.k0.shape, float(form)))
        self.keep(key)

    def plates(self, plates: Plates) -> None:
        """A layer of metal plates."""
        if self.repeat(plates):
            return
        self.rescale(self.reference(plates.filling))
        element = self.new(rows.PLATES)
        element[rows.POINT_ROW] = len(self.points)
        found, marks = plate_ports(plates, self.stack.front, *self.grid, self.y)
        self.diffracts |= marks
        for values in found:
            self.point_rows(values)
        self.keep(plates)

    @property
    def grid(self) -> tuple[np.ndarray, np.ndarray, float]:
        """Frequencies [Hz], angles and azimuth [degrees]."""
        return self.frequencies, self.angles_deg, self.azimuth_deg

    def rescale(self, y: np.ndarray) -> None:
        """Go over to another reference admittance."""
        ratio = np.sqrt(y / self.y)
        if np.any(ratio != 1.0):
            self.new(rows.RESCALE)
            self.row(0.5 * (ratio + 1.0 / ratio))
            self.row(0.5 * (ratio - 1.0 / ratio))
        self.y = y

    def reference(self, material: Material) -> np.ndarray:
        """Reference admittance for a medium, float array of shape (n_freqs,): its own size, or 1 if that is near."""
        eps, mu = material.permittivity(self.frequencies), material.permeability(self.frequencies)
        size = np.sqrt(abs(eps) / abs(mu))
        return np.where((size < _MILD) & (size > 1.0 / _MILD), 1.0, size)

    def repeat(self, key: object) -> bool:
        """Whether an element like this has been laid out already, after the same y; if so it is put in once more."""
        self.entry, self.first = (key, self.y.tobytes()), len(self.elements)
        if key is None or self.entry not in self.known:
            return False
        first, last, self.y = self.known[self.entry]
        self.elements += self.elements[first:last]
        self.scales += self.scales[first:last]
        self.references += self.references[first:last]
        self.positions += [self.position] * (last - first)
        return True

    def keep(self, key: object) -> None:
        """Keep what was laid out since `repeat` said no."""
        if key is not None:
            self.known[self.entry] = self.first, len(self.elements), self.y

    def new(self, kind: int, n_ports: int = 2) -> list[int]:
        """A new element, whose rows follow."""
        element = [0] * rows.N_COLUMNS
        element[rows.KIND], element[rows.ROW], element[rows.N_PORTS] = kind, len(self.table), n_ports
        self.elements.append(element)
        self.positions.append(self.position)
        self.scales.append(self.y)
        self.references.append(())
        return element

    def offset(self, element: list[int]) -> int:
        """Row that comes next, counted from the first of the element."""
        return len(self.table) - element[rows.ROW]

    def row(self, values: np.ndarray) -> None:
        """A real row."""
        self.table.append(np.asarray(values, dtype=float))

    def complex_row(self, values: np.ndarray) -> None:
        """A complex row."""
        self.table += [values.real.copy(), values.imag.copy()]

    def point_rows(self, values: np.ndarray) -> None:
        """A complex row of the point table."""
        self.points += [values.real.copy(), values.imag.copy()]


def _crossing(layer: Layer) -> list[WireSet | Mesh]:
    """The sets of a layer that end at its faces, in the order of their ports."""
    sets: list[WireSet | Mesh] = [wires for wires in layer.wires if wires.crosses_faces]
    return sets if layer.mesh is None else [*sets, layer.mesh]


def _integers(lines: list[list[int]] | list[tuple[int, int, int, int]], width: int) -> np.ndarray:
    return np.array(lines, dtype=np.int64).reshape(len(lines), width)
