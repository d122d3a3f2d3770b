"""What a value in a stack file may be: quantities with units, plain numbers, names of materials.

Every type carries its JSON schema, so that an editor can check a file while it is written.
"""

import re
from collections.abc import Callable
from difflib import get_close_matches
from typing import Annotated, Any, ClassVar

from pydantic import (
    AfterValidator,
    BaseModel,
    ConfigDict,
    PlainValidator,
    ValidationInfo,
    WithJsonSchema,
)
from pydantic_core import PydanticCustomError

from slabsim.errors import UnitError
from slabsim.materials.material import PASSIVE
from slabsim.units import DIMENSIONS, Dimension, Quantity, parse, read_quantity, units_of

VACUUM_NAME = "vacuum"
CONDUCTOR_NAME = "perfect conductor"
_NUMBER_PATTERN = r"^\s*\+?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?\s*"
_LOSSES = ("conductivity", "rate")
_EXTRA_SPELLINGS = {
    "length": ["µm", "μm"],
    "spectral": ["µm", "μm", "1/cm", "1/m"],
    "rate": ["1/cm", "1/m"],
    "angle": ["°"],
    "resistance": ["Ω", "mΩ", "kΩ", "MΩ"],
    "inductance": ["µH", "μH"],
    "capacitance": ["µF", "μF"],
    "time": ["µs", "μs"],
}


class FileTable(BaseModel):
    """One table of a stack file: immutable, no unknown keys, no conversion between text and numbers.

    A subclass provides fields with descriptions and, where a value may be one of several tables, the
    `tag` that tells it from the others.
    """

    model_config = ConfigDict(extra="forbid", frozen=True, strict=True, allow_inf_nan=False, populate_by_name=False)
    tag: ClassVar[str] = ""


def complaint(text: str) -> PydanticCustomError:
    """Error to raise in a validator; `text` says what stands there, what is allowed, and the cure."""
    return PydanticCustomError("slabsim", "{text}", {"text": text})


def suggestion(word: str, choices: list[str]) -> str:
    """``'; did you mean "x"?'`` if a choice is near, else nothing."""
    folded = {choice.lower(): choice for choice in reversed(choices)}
    near = get_close_matches(word.lower(), folded, n=1, cutoff=0.6)
    return f'; did you mean "{folded[near[0]]}"?' if near else ""


def _reader(dimension: Dimension, allow_zero: bool = False) -> Callable[[object], float]:
    _, wanted, _ = DIMENSIONS[dimension]

    def read(value: object) -> float:
        try:
            number = parse(value, dimension)
        except UnitError as error:
            raise complaint(str(error)) from None
        if number < 0.0 and dimension in _LOSSES:
            raise complaint(f'"{value}" would amplify; it must be zero or more: {PASSIVE}')
        if number < 0.0 or (number == 0.0 and not allow_zero):
            allowed = "zero or more" if allow_zero else "greater than zero"
            raise complaint(f'"{value}": {wanted} must be {allowed} here')
        return number

    return read


def _read_as_written(dimension: Dimension) -> Callable[[object], Quantity]:
    def read(value: object) -> Quantity:
        try:
            return read_quantity(value, dimension)
        except UnitError as error:
            raise complaint(str(error)) from None

    return read


def _schema(dimension: Dimension) -> WithJsonSchema:
    units = units_of(dimension) + _EXTRA_SPELLINGS.get(dimension, [])
    sign = _NUMBER_PATTERN.replace(r"\+", "[+-]") if dimension == "angle" else _NUMBER_PATTERN
    pattern = sign + "(" + "|".join(re.escape(unit) for unit in units) + r")\s*$"
    return WithJsonSchema({"type": "string", "pattern": pattern, "examples": list(DIMENSIONS[dimension][2])})


Length = Annotated[float, PlainValidator(_reader("length")), _schema("length")]
Spectral = Annotated[float, PlainValidator(_reader("spectral")), _schema("spectral")]
Damping = Annotated[float, PlainValidator(_reader("rate", allow_zero=True)), _schema("rate")]
Conductivity = Annotated[float, PlainValidator(_reader("conductivity", allow_zero=True)), _schema("conductivity")]
FilmConductivity = Annotated[float, PlainValidator(_reader("conductivity")), _schema("conductivity")]
SheetResistance = Annotated[float, PlainValidator(_reader("resistance")), _schema("resistance")]
Resistance = Annotated[float, PlainValidator(_reader("resistance", allow_zero=True)), _schema("resistance")]
Inductance = Annotated[float, PlainValidator(_reader("inductance", allow_zero=True)), _schema("inductance")]
Capacitance = Annotated[float, PlainValidator(_reader("capacitance")), _schema("capacitance")]
Time = Annotated[float, PlainValidator(_reader("time")), _schema("time")]
SpectralAsWritten = Annotated[Quantity, PlainValidator(_read_as_written("spectral")), _schema("spectral")]
AngleAsWritten = Annotated[Quantity, PlainValidator(_read_as_written("angle")), _schema("angle")]


def _known(builtin: tuple[str, ...]) -> Callable[[str, ValidationInfo], str]:
    def check(name: str, info: ValidationInfo) -> str:
        if info.context is None:
            return name
        known = [*builtin, *info.context["materials"]]
        if name not in known:
            allowed = suggestion(name, known) or "; defined are " + ", ".join(f'"{one}"' for one in known)
            raise complaint(f'material "{name}" is not defined{allowed}')
        return name

    return check


def _not_builtin(name: str) -> str:
    if name in (VACUUM_NAME, CONDUCTOR_NAME):
        raise complaint(f'"{name}" is built in and cannot be redefined; choose another name')
    if not name.strip():
        raise complaint("a material needs a name")
    return name


Host = Annotated[str, AfterValidator(_known((VACUUM_NAME,)))]
HostOrConductor = Annotated[str, AfterValidator(_known((VACUUM_NAME, CONDUCTOR_NAME)))]
Metal = Annotated[str, AfterValidator(_known((CONDUCTOR_NAME,)))]
NewMaterial = Annotated[str, AfterValidator(_not_builtin)]


def form_of(value: Any) -> str:
    """Tag of the union member meant: "a table", "a list" or "one value"."""
    return "a table" if isinstance(value, dict) else "a list" if isinstance(value, list) else "one value"
