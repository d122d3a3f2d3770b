"""Tables of wires in a stack file: sets of parallel wires, meshes, planes of wires; and what their ends meet."""

from typing import Annotated, Any, ClassVar, Literal

from pydantic import AfterValidator, Discriminator, Field, Tag, ValidationInfo, field_validator, model_validator

from slabsim.stack.directions import along_axis, tilted
from slabsim.stack.file_sweep import AzimuthAngle, degrees
from slabsim.stack.quantities import (
    AngleAsWritten,
    Capacitance,
    FileTable,
    Inductance,
    Length,
    Metal,
    Resistance,
    Spectral,
    complaint,
    form_of,
)
from slabsim.stack.sample import Direction
from slabsim.units import Quantity, format_length

PLASMA_WORDS = ("lattice", "logarithmic", "gap")
_NEARLY_FLAT = 89.9  # tilt [degrees] beyond which wires through the faces would be longer than 570 thicknesses
_NO_TURN = Quantity(0.0, "deg")
_PLASMA = '"lattice", "logarithmic", "gap", or the measured plasma edge, "12.3 GHz"'
_INDUCTANCE = '"vacuum", or "host": whether the permeability of the host acts on the field around the wires'


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
_ENDS: Any = Field(
    ["open", "open"],
    min_length=2,
    max_length=2,
    description='Front and back: "open", "grounded", "joined" or a load { resistance = "50 ohm" }',
)


def _plasma_form(value: Any) -> str:
    is_quantity = isinstance(value, str) and value.strip()[:1] in tuple("0123456789.+-")
    return "a quantity" if is_quantity else "a word"


Plasma = Annotated[
    Annotated[Literal["lattice", "logarithmic", "gap"], Tag("a word")] | Annotated[Spectral, Tag("a quantity")],
    Discriminator(_plasma_form),
]
InductanceWord = Literal["vacuum", "host"]


def _reachable(quantity: Quantity) -> Quantity:
    tilt = degrees(quantity)
    if not 0.0 <= tilt <= 90.0:
        raise complaint(f'"{quantity.value:.12g} {quantity.unit}"; a tilt from z must lie between 0 deg and 90 deg')
    if _NEARLY_FLAT < tilt < 90.0:
        raise complaint(
            f'"{quantity.value:.12g} {quantity.unit}": such wires hardly reach the other face; '
            'a tilt is at most 89.9 deg, or "90 deg" for wires parallel to the faces'
        )
    return quantity


Tilt = Annotated[AngleAsWritten, AfterValidator(_reachable)]


class DirectionTable(FileTable):
    """A direction by its tilt from z and the azimuth, from x, of its projection on the faces."""

    tag: ClassVar[str] = "a table"
    tilt: Tilt = Field(description='Angle from z, 0 to 90 deg, such as "20 deg"')
    azimuth: AzimuthAngle = Field(default_factory=lambda: _NO_TURN, description='From x, such as "45 deg"')


class FlatDirectionTable(FileTable):
    """A direction parallel to the faces by its azimuth from x."""

    tag: ClassVar[str] = "a table"
    azimuth: AzimuthAngle = Field(description='From x, such as "30 deg"')


_WORD_OR_TABLE = Discriminator(lambda value: "a table" if isinstance(value, dict | FileTable) else "a word")
Axis = Annotated[
    Annotated[Literal["x", "y", "z"], Tag("a word")] | Annotated[DirectionTable, Tag("a table")], _WORD_OR_TABLE
]
FlatAxis = Annotated[
    Annotated[Literal["x", "y"], Tag("a word")] | Annotated[FlatDirectionTable, Tag("a table")], _WORD_OR_TABLE
]


class WireTable(FileTable):
    """A set of parallel wires, one for each cell across them."""

    axis: Axis = Field("z", description='"x", "y", "z", or { tilt = "20 deg", azimuth = "0 deg" }')
    pitch: Pitch = Field(description='Distance between wires, "2 mm", or the cell\'s sides, ["2 mm", "3 mm"]')
    radius: Length = Field(description='Wire radius, less than half the pitch, such as "50 um"')
    metal: Metal = Field(description='A material, or "perfect conductor"')
    ends: list[End] = _ENDS
    plasma: Plasma = Field("lattice", description=_PLASMA)
    inductance: InductanceWord = Field("vacuum", description=_INDUCTANCE)

    @property
    def cell(self) -> tuple[float, float]:
        """Sides of the cell [m]."""
        return (self.pitch[0], self.pitch[1]) if isinstance(self.pitch, list) else (self.pitch, self.pitch)

    @property
    def direction(self) -> Direction:
        """Unit vector along the wires."""
        if isinstance(self.axis, DirectionTable):
            return tilted(degrees(self.axis.tilt), degrees(self.axis.azimuth))
        return along_axis(self.axis)

    @field_validator("radius")
    @classmethod
    def _wires_do_not_touch(cls, value: float, info: ValidationInfo) -> float:
        return _apart(value, info)

    @model_validator(mode="after")
    def _ends_where_there_are_ends(self) -> "WireTable":
        if self.direction[2] == 0.0 and "ends" in self.model_fields_set:
            raise complaint("ends of wires that are parallel to the faces: they end at no face; leave ends out")
        return self


class MeshTable(FileTable):
    """A cubic mesh: wires along x, y and z, joined where they meet."""

    pitch: Length = Field(description='Side of the cubic cell, such as "2 mm"')
    radius: Length = Field(description='Wire radius, less than half the pitch, such as "50 um"')
    metal: Metal = Field(description='A material, or "perfect conductor"')
    ends: list[End] = _ENDS
    plasma: Plasma = Field("lattice", description=f"Of one set: {_PLASMA}")
    stiffness: float | None = Field(
        None, gt=0.0, description="l0, the capacitance of the joined wires over that of one set; default: by formula"
    )
    inductance: InductanceWord = Field("vacuum", description=_INDUCTANCE)

    @property
    def cell(self) -> tuple[float, float]:
        """Sides of a face of the cell [m]."""
        return self.pitch, self.pitch

    @property
    def direction(self) -> Direction:
        """Unit vector along the wires that end at the faces."""
        return along_axis("z")

    @field_validator("radius")
    @classmethod
    def _wires_do_not_touch(cls, value: float, info: ValidationInfo) -> float:
        return _apart(value, info)


class GridData(FileTable):
    """One plane of parallel wires."""

    axis: FlatAxis = Field(description='"x", "y", or { azimuth = "30 deg" }')
    pitch: Length = Field(description='Distance between wires, such as "2 mm"')
    radius: Length = Field(description='Wire radius, less than half the pitch, such as "50 um"')
    metal: Metal = Field(description='A material, or "perfect conductor"')

    @property
    def direction(self) -> Direction:
        """Unit vector along the wires."""
        if isinstance(self.axis, FlatDirectionTable):
            return tilted(90.0, degrees(self.axis.azimuth))
        return along_axis(self.axis)

    @field_validator("radius")
    @classmethod
    def _wires_do_not_touch(cls, value: float, info: ValidationInfo) -> float:
        return _apart(value, info)


def _apart(radius: float, info: ValidationInfo) -> float:
    pitch = info.data.get("pitch")
    if pitch is None:
        return radius
    smaller = min(pitch) if isinstance(pitch, list) else pitch
    if 2.0 * radius >= smaller:
        raise complaint(
            f'"{format_length(radius)}" with pitch "{format_length(smaller)}": neighbouring wires touch; '
            f"the radius must be less than {format_length(smaller / 2.0)}"
        )
    return radius
