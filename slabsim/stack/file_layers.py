"""Tables `[[layer]]` of a stack file: layers with or without wires, plates, sheets, groups."""

from typing import Annotated, Any, ClassVar, Literal

from pydantic import Discriminator, Field, Tag, ValidationInfo, field_validator, model_validator

from slabsim.stack.file_sweep import AzimuthAngle
from slabsim.stack.file_wires import GridData, MeshTable, WireTable
from slabsim.stack.quantities import (
    FileTable,
    FilmConductivity,
    Host,
    Length,
    SheetResistance,
    complaint,
    suggestion,
)
from slabsim.units import Quantity, format_length

MAX_ELEMENTS = 10_000  # layers and sheets, groups written out
MAX_SETS = 16  # of wires in a layer
_NAME = Field("", description="Free text; messages and reports use it")
Shape = Literal["layer", "plates", "patches", "strips", "film", "grid", "group"]
_SHAPES: dict[Shape, tuple[str, ...]] = {
    "layer": ("material", "wires", "mesh", "rotation"),
    "plates": ("plates",),
    "patches": ("patches",),
    "strips": ("strips",),
    "film": ("film",),
    "grid": ("grid",),
    "group": ("repeat", "layers"),
}
ENTRY_FORMS = (
    "a layer (material, thickness, and wires or mesh if any), plates (plates, thickness), a sheet (one of patches, "
    "strips, film, grid) or a group (repeat, layers)"
)


class LayerTable(FileTable):
    """A homogeneous layer; with wires, its material is the host between them."""

    tag: ClassVar[str] = "layer entry"
    name: str = _NAME
    material: Host = Field(description='A defined material, or "vacuum"')
    thickness: Length = Field(description='Thickness of the layer, such as "10 mm"')
    wires: list[WireTable] | None = Field(
        None, min_length=1, max_length=MAX_SETS, description="The sets of wires in this layer, each a [[layer.wires]]"
    )
    mesh: MeshTable | None = Field(None, description='Joined wires, { pitch = "2 mm", radius = "50 um", metal = ... }')
    rotation: AzimuthAngle = Field(
        default_factory=lambda: Quantity(0.0, "deg"),
        description='Turns the axes of material, wires and mesh about z, such as "30 deg"',
    )

    @model_validator(mode="after")
    def _wires_or_mesh(self) -> "LayerTable":
        if self.wires and self.mesh:
            raise complaint("wires and mesh in one layer; a layer has either sets of wires or a mesh")
        return self


class PlatesData(FileTable):
    """Thin metal plates at right angles to the faces."""

    spacing: Length = Field(description='Distance between plates, such as "4 mm"')
    normal: Literal["x", "y"] = Field(description='Direction across the plates, "x" or "y"')
    filling: Host = Field("vacuum", description='Isotropic material between them, "vacuum" by default')


class PlatesTable(FileTable):
    """A layer of metal plates: a waveguide array, one direction of a honeycomb."""

    tag: ClassVar[str] = "plates entry"
    name: str = _NAME
    thickness: Length = Field(description='Depth of the plates, at least half their spacing, such as "6 mm"')
    plates: PlatesData = Field(description='{ spacing = "4 mm", normal = "y", filling = "vacuum" }')

    @model_validator(mode="after")
    def _edges_apart(self) -> "PlatesTable":
        if self.thickness < 0.5 * self.plates.spacing:
            raise complaint(
                f'thickness "{format_length(self.thickness)}" with spacing "{format_length(self.plates.spacing)}": '
                "the two edges of the plates would see each other's near fields, and they are solved one by one; "
                f"the thickness must be at least {format_length(0.5 * self.plates.spacing)}"
            )
        return self


class PatchesData(FileTable):
    """Square conducting patches."""

    period: Length = Field(description='Period of the sheet, such as "2 mm"')
    gap: Length = Field(description='Gap between neighbouring patches, less than the period, such as "0.2 mm"')

    @field_validator("gap")
    @classmethod
    def _gap_fits(cls, value: float, info: ValidationInfo) -> float:
        return _less_than_period(value, info, "gap")


class StripsData(FileTable):
    """Crossed conducting strips."""

    period: Length = Field(description='Period of the sheet, such as "2 mm"')
    width: Length = Field(description='Width of a strip, less than the period, such as "0.1 mm"')

    @field_validator("width")
    @classmethod
    def _width_fits(cls, value: float, info: ValidationInfo) -> float:
        return _less_than_period(value, info, "width")


class FilmData(FileTable):
    """A resistive film: its sheet resistance, or conductivity and thickness."""

    sheet_resistance: SheetResistance | None = Field(None, description='Such as "377 ohm" (per square)')
    conductivity: FilmConductivity | None = Field(None, description='With thickness: such as "5.8e7 S/m"')
    thickness: Length | None = Field(None, description='With conductivity: such as "20 nm"')

    @model_validator(mode="after")
    def _one_form(self) -> "FilmData":
        given = [name for name in type(self).model_fields if getattr(self, name) is not None]
        if given not in (["sheet_resistance"], ["conductivity", "thickness"]):
            raise complaint(
                f"{' and '.join(given) or 'nothing'} given; a film has either sheet_resistance, "
                "or conductivity and thickness"
            )
        return self


class PatchesTable(FileTable):
    """A sheet of patches, zero thickness."""

    tag: ClassVar[str] = "patches entry"
    name: str = _NAME
    patches: PatchesData = Field(description='{ period = "2 mm", gap = "0.2 mm" }')


class StripsTable(FileTable):
    """A sheet of crossed strips, zero thickness."""

    tag: ClassVar[str] = "strips entry"
    name: str = _NAME
    strips: StripsData = Field(description='{ period = "2 mm", width = "0.1 mm" }')


class FilmTable(FileTable):
    """A resistive film, zero thickness."""

    tag: ClassVar[str] = "film entry"
    name: str = _NAME
    film: FilmData = Field(description='{ sheet_resistance = "377 ohm" }')


class GridTable(FileTable):
    """A plane of parallel wires, zero thickness."""

    tag: ClassVar[str] = "grid entry"
    name: str = _NAME
    grid: GridData = Field(description='{ axis = "x", pitch = "2 mm", radius = "50 um", metal = "copper" }')


class GroupTable(FileTable):
    """Layers and sheets, repeated."""

    tag: ClassVar[str] = "group entry"
    name: str = _NAME
    repeat: int = Field(ge=1, description="How often the group stands in the stack")
    layers: list["Entry"] = Field(min_length=1, description="What is repeated, front to back")


def entry_shape(value: Any) -> Shape | None:
    """Which of the forms a `[[layer]]` entry has; None if none, or a mixture."""
    if not isinstance(value, dict):
        return None
    hit = [shape for shape, keys in _SHAPES.items() if any(key in value for key in keys)]
    if "thickness" in value and "plates" not in hit and "layer" not in hit:
        hit.append("layer")
    return hit[0] if len(hit) == 1 else None


def _entry_tag(value: Any) -> str | None:
    shape = entry_shape(value)
    return f"{shape} entry" if shape else None


def entry_complaint(value: Any) -> str:
    """Why a `[[layer]]` entry has no form."""
    if not isinstance(value, dict):
        return f"an entry must be a table: {ENTRY_FORMS}"
    markers = [key for keys in _SHAPES.values() for key in keys]
    found = [key for key in value if key in markers]
    if found:
        if len(found) == 1:  # what is at odds with the one marker
            found += [key for key in value if key == "thickness"]
        return f"{' and '.join(found)} in one entry; an entry is either {ENTRY_FORMS}"
    unknown = [key for key in value if key != "name"]
    for key in unknown:
        hint = suggestion(key, markers)
        if hint:
            return f'unknown key "{key}"{hint}'
    keys = ", ".join(f'"{key}"' for key in unknown)
    return f"{f'unknown key {keys}' if unknown else 'an empty entry'}; an entry is either {ENTRY_FORMS}"


Entry = Annotated[
    Annotated[LayerTable, Tag("layer entry")]
    | Annotated[PlatesTable, Tag("plates entry")]
    | Annotated[PatchesTable, Tag("patches entry")]
    | Annotated[StripsTable, Tag("strips entry")]
    | Annotated[FilmTable, Tag("film entry")]
    | Annotated[GridTable, Tag("grid entry")]
    | Annotated[GroupTable, Tag("group entry")],
    Discriminator(_entry_tag),
]
GroupTable.model_rebuild()


def _less_than_period(value: float, info: ValidationInfo, what: str) -> float:
    period = info.data.get("period", 2.0 * value)
    if value >= period:
        raise complaint(
            f'"{format_length(value)}" with period "{format_length(period)}"; the {what} must be less than the period'
        )
    return value
