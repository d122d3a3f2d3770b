"""Tables `[[layer]]` of a stack file: layers with or without wires, sheets, groups."""

from typing import Annotated, Any, ClassVar, Literal

from pydantic import Discriminator, Field, Tag, ValidationInfo, field_validator, model_validator

from slabsim.stack.quantities import (
    Capacitance,
    FileTable,
    FilmConductivity,
    Host,
    Inductance,
    Length,
    Metal,
    Resistance,
    SheetResistance,
    Spectral,
    complaint,
    form_of,
    suggestion,
)
from slabsim.units import format_length

MAX_ELEMENTS = 10_000  # layers and sheets, groups written out
_NAME = Field("", description="Free text; messages and reports use it")
Shape = Literal["layer", "patches", "strips", "film", "group"]
_SHAPES: dict[Shape, tuple[str, ...]] = {
    "layer": ("material", "thickness", "wires"),
    "patches": ("patches",),
    "strips": ("strips",),
    "film": ("film",),
    "group": ("repeat", "layers"),
}
ENTRY_FORMS = (
    "a layer (material, thickness, and wires if any), a sheet (one of patches, strips, film) "
    "or a group (repeat, layers)"
)
PLASMA_WORDS = ("lattice", "logarithmic", "gap")


class LoadTable(FileTable):
    """Resistance, inductance and capacitance in series at a wire end."""

    tag: ClassVar[str] = "a table"
    resistance: Resistance = Field(0.0, description='Such as "50 ohm"')
    inductance: Inductance = Field(0.0, description='Such as "1 nH"')
    capacitance: Capacitance | None = Field(None, description='Such as "0.1 pF"; left out, it is a short')

    @model_validator(mode="after")
    def _not_empty(self) -> "LoadTable":
        if not self.model_fields_set:
            raise complaint("an empty load; give resistance, inductance or capacitance")
        return self


EndWord = Literal["open", "grounded", "joined"]
End = Annotated[
    Annotated[EndWord, Tag("a word")] | Annotated[LoadTable, Tag("a table")],
    Discriminator(lambda value: "a table" if isinstance(value, dict | LoadTable) else "a word"),
]
Pitch = Annotated[
    Annotated[Length, Tag("one value")] | Annotated[list[Length], Field(min_length=2, max_length=2), Tag("a list")],
    Discriminator(lambda value: "a list" if form_of(value) == "a list" else "one value"),
]


def _plasma_form(value: Any) -> str:
    is_quantity = isinstance(value, str) and value.strip()[:1] in tuple("0123456789.+-")
    return "a quantity" if is_quantity else "a word"


Plasma = Annotated[
    Annotated[Literal["lattice", "logarithmic", "gap"], Tag("a word")] | Annotated[Spectral, Tag("a quantity")],
    Discriminator(_plasma_form),
]


class WireTable(FileTable):
    """Parallel wires along z, one for each cell."""

    axis: Literal["z"] = Field("z", description="Direction of the wires: normal to the faces")
    pitch: Pitch = Field(description='Distance between wires, "2 mm", or the cell\'s sides, ["2 mm", "3 mm"]')
    radius: Length = Field(description='Wire radius, less than half the pitch, such as "50 um"')
    metal: Metal = Field(description='A material, or "perfect conductor"')
    ends: list[End] = Field(
        ["open", "open"],
        min_length=2,
        max_length=2,
        description='Front and back: "open", "grounded", "joined" or a load { resistance = "50 ohm" }',
    )
    plasma: Plasma = Field(
        "lattice", description='"lattice", "logarithmic", "gap", or the measured plasma edge, "12.3 GHz"'
    )

    @property
    def cell(self) -> tuple[float, float]:
        """Sides of the cell [m]."""
        return (self.pitch[0], self.pitch[1]) if isinstance(self.pitch, list) else (self.pitch, self.pitch)

    @field_validator("radius")
    @classmethod
    def _wires_do_not_touch(cls, value: float, info: ValidationInfo) -> float:
        pitch = info.data.get("pitch")
        if pitch is None:
            return value
        smaller = min(pitch) if isinstance(pitch, list) else pitch
        if 2.0 * value >= smaller:
            raise complaint(
                f'"{format_length(value)}" with pitch "{format_length(smaller)}": neighbouring wires touch; '
                f"the radius must be less than {format_length(smaller / 2.0)}"
            )
        return value


class LayerTable(FileTable):
    """A homogeneous layer; with wires, its material is the host between them."""

    tag: ClassVar[str] = "layer entry"
    name: str = _NAME
    material: Host = Field(description='A defined material, or "vacuum"')
    thickness: Length = Field(description='Thickness of the layer, such as "10 mm"')
    wires: list[WireTable] | None = Field(None, description="The wires in this layer, one [[layer.wires]]")

    @field_validator("wires")
    @classmethod
    def _one_set(cls, value: list[WireTable] | None) -> list[WireTable] | None:
        if value is not None and len(value) != 1:
            raise complaint(f"{len(value)} sets of wires; there must be one set of wires per layer")
        return value


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


class GroupTable(FileTable):
    """Layers and sheets, repeated."""

    tag: ClassVar[str] = "group entry"
    name: str = _NAME
    repeat: int = Field(ge=1, description="How often the group stands in the stack")
    layers: list["Entry"] = Field(min_length=1, description="What is repeated, front to back")


def entry_shape(value: Any) -> Shape | None:
    """Which of the five forms a `[[layer]]` entry has; None if none, or a mixture."""
    if not isinstance(value, dict):
        return None
    hit = [shape for shape, keys in _SHAPES.items() if any(key in value for key in keys)]
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
    | Annotated[PatchesTable, Tag("patches entry")]
    | Annotated[StripsTable, Tag("strips entry")]
    | Annotated[FilmTable, Tag("film entry")]
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
