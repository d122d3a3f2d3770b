"""From the checked file to the sample: tables become materials, layers and a sweep."""

from collections.abc import Callable
from math import radians

from slabsim.constants import C0
from slabsim.materials.dispersion import (
    Constant,
    Debye,
    Drude,
    Lorentz,
    Oscillator,
    ResonantPermeability,
    Sellmeier,
)
from slabsim.materials.material import VACUUM, Axes, Material
from slabsim.materials.tables import read_table
from slabsim.stack.document import Document
from slabsim.stack.file_layers import (
    Entry,
    FilmTable,
    GridTable,
    GroupTable,
    LayerTable,
    PatchesTable,
    PlatesTable,
    StripsTable,
)
from slabsim.stack.file_materials import ElectricAxesTable, MagneticAxesTable, MaterialTable, ResonanceTable
from slabsim.stack.file_sweep import SweepTable, angles_deg, degrees, frequencies, spectral_unit
from slabsim.stack.file_wires import LoadTable, MeshTable, WireTable
from slabsim.stack.joints import EndKind
from slabsim.stack.lines import Path
from slabsim.stack.quantities import CONDUCTOR_NAME, VACUUM_NAME
from slabsim.stack.sample import (
    Element,
    Film,
    Grid,
    Group,
    Layer,
    Mesh,
    Patches,
    Plates,
    SeriesLoad,
    Stack,
    Strips,
    Sweep,
    WireEnd,
    WireSet,
)


def build_material(name: str, table: MaterialTable, read_text: Callable[[str], str]) -> Material:
    """Material that a `[material.name]` table describes.

    Parameters
    ----------
    name : str
    table : MaterialTable
    read_text : callable
        File name to text of a material table.

    Raises
    ------
    MaterialError
        If the table file cannot be read.
    """
    magnetic = _permeability(table)
    if table.table is not None:
        tabulated = read_table(name, read_text(table.table), table.table)
        return Material(name, tabulated.electric, magnetic, tabulated.spectral_range, tabulated.spectral_unit)
    if table.sellmeier is not None:
        model = Sellmeier(tuple(table.sellmeier.B), tuple(table.sellmeier.C))
        ends = table.sellmeier.range
        span = (C0 / ends[1], C0 / ends[0]) if ends else None
        return Material(name, model, magnetic, span, "um")
    return Material(name, _electric(table), magnetic)


def build_sweep(table: SweepTable) -> Sweep:
    """Sweep arrays, each ascending."""
    polarizations = [table.polarization] if isinstance(table.polarization, str) else table.polarization
    return Sweep(
        frequencies=frequencies(table.spectrum),
        angles_deg=angles_deg(table.angle),
        azimuths_deg=angles_deg(table.azimuth),
        polarizations=tuple(polarizations),
        model=table.model,
        store=tuple(table.store),
        spectral_unit=spectral_unit(table.spectrum),
    )


def build_stack(document: Document, materials: dict[str, Material], ends: dict[Path, EndKind]) -> Stack:
    """Stack of a file without faults; `materials` by name, `ends` as `joints.resolve_ends` gives them."""
    builder = _Builder({VACUUM_NAME: VACUUM, **materials}, ends)
    return Stack(
        title=document.title,
        front=builder.materials[document.front],
        back=builder.conductor_or(document.back),
        elements=builder.elements(document.layer, ("layer",)),
        sweep=build_sweep(document.sweep),
    )


class _Builder:
    def __init__(self, materials: dict[str, Material], ends: dict[Path, EndKind]) -> None:
        self.materials = materials
        self.ends = ends

    def conductor_or(self, name: str) -> Material | None:
        return None if name == CONDUCTOR_NAME else self.materials[name]

    def elements(self, entries: list[Entry], path: Path) -> tuple[Element, ...]:
        return tuple(self._element(entry, (*path, index)) for index, entry in enumerate(entries))

    def _element(self, entry: Entry, path: Path) -> Element:
        match entry:
            case LayerTable():
                return self._layer(entry, path)
            case PlatesTable():
                plates = entry.plates
                filling = self.materials[plates.filling]
                return Plates(entry.name, entry.thickness, plates.spacing, plates.normal, filling)
            case PatchesTable():
                return Patches(entry.name, entry.patches.period, entry.patches.gap)
            case StripsTable():
                return Strips(entry.name, entry.strips.period, entry.strips.width)
            case FilmTable():
                film = entry.film
                return Film(entry.name, film.sheet_resistance, film.conductivity, film.thickness)
            case GridTable():
                grid = entry.grid
                return Grid(entry.name, grid.pitch, grid.radius, self.conductor_or(grid.metal), grid.direction)
            case GroupTable():
                return Group(entry.repeat, self.elements(entry.layers, (*path, "layers")))

    def _layer(self, entry: LayerTable, path: Path) -> Layer:
        wires = tuple(self._wires(one, (*path, "wires", k)) for k, one in enumerate(entry.wires or []))
        mesh = None if entry.mesh is None else self._mesh(entry.mesh, (*path, "mesh"))
        rotation = radians(degrees(entry.rotation))
        return Layer(entry.name, self.materials[entry.material], entry.thickness, wires, mesh, rotation)

    def _wires(self, table: WireTable, path: Path) -> WireSet:
        return WireSet(
            pitch=table.cell,
            radius=table.radius,
            metal=self.conductor_or(table.metal),
            ends=self._both_ends(table, path),
            plasma=table.plasma,
            direction=table.direction,
            inductance=table.inductance,
        )

    def _mesh(self, table: MeshTable, path: Path) -> Mesh:
        return Mesh(
            pitch=table.pitch,
            radius=table.radius,
            metal=self.conductor_or(table.metal),
            ends=self._both_ends(table, path),
            plasma=table.plasma,
            stiffness=table.stiffness,
            inductance=table.inductance,
        )

    def _both_ends(self, table: WireTable | MeshTable, path: Path) -> tuple[WireEnd, WireEnd]:
        front, back = (self._end(end, (*path, "ends", side)) for side, end in enumerate(table.ends))
        return front, back

    def _end(self, end: str | LoadTable, path: Path) -> WireEnd:
        load = SeriesLoad(end.resistance, end.inductance, end.capacitance) if isinstance(end, LoadTable) else None
        return WireEnd(self.ends.get(path, "open"), load)


def _electric(table: MaterialTable) -> Constant | Drude | Lorentz | Debye | Axes:
    if table.drude is not None:
        return Drude(table.drude.plasma, table.drude.collision, table.drude.background)
    if table.lorentz is not None:
        terms = (Oscillator(one.resonance, one.strength, one.damping) for one in table.lorentz.oscillators)
        return Lorentz(table.lorentz.background, tuple(terms))
    if table.debye is not None:
        return Debye(table.debye.static, table.debye.infinity, table.debye.relaxation)
    value = 1.0 if table.permittivity is None else table.permittivity
    loss = table.loss_tangent or 0.0, table.conductivity or 0.0
    if isinstance(value, ElectricAxesTable):
        axes = Constant(value.xx, *loss), Constant(value.yy, *loss), Constant(value.zz, *loss)
        return axes if len(set(axes)) > 1 else axes[0]
    return Constant(value, *loss)


def _permeability(table: MaterialTable) -> Constant | ResonantPermeability | Axes | None:
    given = table.permeability
    if isinstance(given, MagneticAxesTable):
        if not given.xx == given.yy == given.zz:
            return _magnetic(given.xx), _magnetic(given.yy), _magnetic(given.zz)
        given = given.xx
    return None if given == 1.0 else _magnetic(given)


def _magnetic(given: float | ResonanceTable) -> Constant | ResonantPermeability:
    if isinstance(given, ResonanceTable):
        return ResonantPermeability(given.resonance, given.strength, given.damping)
    return Constant(given)
