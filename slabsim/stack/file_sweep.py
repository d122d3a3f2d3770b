"""Table `[sweep]` of a stack file: its axes, kept in the units they are written in."""

from itertools import pairwise
from typing import Annotated, Any, ClassVar, Literal

import numpy as np
from pydantic import AfterValidator, Discriminator, Field, Tag, field_validator, model_validator

from slabsim.stack.quantities import AngleAsWritten, FileTable, SpectralAsWritten, complaint, form_of
from slabsim.units import Quantity, spectral_kind, to_hz, to_si

MAX_POINTS = 10_000_000  # of one axis
_SPECTRUM_LIST = Field(min_length=1, max_length=MAX_POINTS, description='Such as ["5 GHz", "8 GHz"]')
_ANGLE_LIST = Field(min_length=1, max_length=MAX_POINTS, description='Such as ["0 deg", "45 deg"]')


def _positive(quantity: Quantity) -> Quantity:
    if not quantity.value > 0.0:
        raise complaint(f"{_written(quantity)}; it must be greater than zero")
    return quantity


def _below_grazing(quantity: Quantity) -> Quantity:
    if not 0.0 <= degrees(quantity) < 90.0:
        raise complaint(f"{_written(quantity)}; an angle of incidence must satisfy 0 deg <= angle < 90 deg")
    return quantity


def _one_turn(quantity: Quantity) -> Quantity:
    if not -360.0 <= degrees(quantity) <= 360.0:
        raise complaint(f"{_written(quantity)}; an azimuth must lie between -360 deg and 360 deg")
    return quantity


def _written(quantity: Quantity) -> str:
    return f'"{quantity.value:.12g} {quantity.unit}"'


def degrees(angle: Quantity) -> float:
    """An angle in degrees, to the last digit if written so."""
    return angle.value if angle.unit == "deg" else float(np.rad2deg(to_si(*angle)))


SpectralPoint = Annotated[SpectralAsWritten, AfterValidator(_positive)]
PolarAngle = Annotated[AngleAsWritten, AfterValidator(_below_grazing)]
AzimuthAngle = Annotated[AngleAsWritten, AfterValidator(_one_turn)]


class AxisRange(FileTable):
    """Equally spaced points from one value to another."""

    tag: ClassVar[str] = "a range"
    points: int = Field(ge=1, le=MAX_POINTS, description="How many points, both ends included")
    spacing: Literal["linear", "log"] = Field("linear", description='"linear", or "log" for equal ratios')

    def spaced(self, first: float, last: float) -> np.ndarray:
        """`points` numbers, both ends included."""
        if self.spacing == "log":
            return np.geomspace(first, last, self.points)
        return np.linspace(first, last, self.points)

    def check_ends(self, first: float, last: float) -> None:
        """Refuse a range without a meaning, or with two."""
        if first == last and self.points != 1:
            raise complaint(f"from equals to, but points = {self.points}; a single value has points = 1")
        if first != last and self.points == 1:
            raise complaint("points = 1, but from and to differ; write one value, or at least 2 points")
        if self.spacing == "log" and min(first, last) <= 0.0:
            raise complaint('spacing = "log" needs both ends greater than zero')


class SpectrumRange(AxisRange):
    """Points spaced in the quantity in which both ends are written."""

    start: SpectralPoint = Field(alias="from", description='First value, such as "5 GHz" or "1.2 um"')
    stop: SpectralPoint = Field(alias="to", description='Last value, of the same kind, such as "40 GHz"')

    @model_validator(mode="after")
    def _consistent(self) -> "SpectrumRange":
        first, last = spectral_kind(self.start.unit), spectral_kind(self.stop.unit)
        if first != last:
            raise complaint(
                f"from is a {first} and to a {last}; both must be of the same kind, because the points are spaced in it"
            )
        self.check_ends(to_hz(*self.start), to_hz(*self.stop))
        return self


class AngleRange(AxisRange):
    """From one polar angle to another."""

    start: PolarAngle = Field(alias="from", description='First angle, such as "0 deg"')
    stop: PolarAngle = Field(alias="to", description='Last angle, less than 90 deg, such as "80 deg"')

    @model_validator(mode="after")
    def _consistent(self) -> "AngleRange":
        self.check_ends(degrees(self.start), degrees(self.stop))
        return self


class AzimuthRange(AxisRange):
    """From one azimuth to another."""

    start: AzimuthAngle = Field(alias="from", description='First azimuth, such as "0 deg"')
    stop: AzimuthAngle = Field(alias="to", description='Last azimuth, such as "90 deg"')

    @model_validator(mode="after")
    def _consistent(self) -> "AzimuthRange":
        self.check_ends(degrees(self.start), degrees(self.stop))
        return self


class SpectrumValues(FileTable):
    """A list of spectral points."""

    tag: ClassVar[str] = "values"
    values: list[SpectralPoint] = _SPECTRUM_LIST

    @field_validator("values")
    @classmethod
    def _distinct(cls, values: list[Quantity]) -> list[Quantity]:
        return _refuse_twins(values, [to_hz(*quantity) for quantity in values])


class AngleValues(FileTable):
    """A list of polar angles."""

    tag: ClassVar[str] = "values"
    values: list[PolarAngle] = _ANGLE_LIST

    @field_validator("values")
    @classmethod
    def _distinct(cls, values: list[Quantity]) -> list[Quantity]:
        return _refuse_twins(values, [degrees(quantity) for quantity in values])


class AzimuthValues(FileTable):
    """A list of azimuths."""

    tag: ClassVar[str] = "values"
    values: list[AzimuthAngle] = _ANGLE_LIST

    @field_validator("values")
    @classmethod
    def _distinct(cls, values: list[Quantity]) -> list[Quantity]:
        return _refuse_twins(values, [degrees(quantity) for quantity in values])


def _axis_form(value: Any) -> str:
    if isinstance(value, dict):
        return "values" if "values" in value else "a range"
    return "one value"


_FORM = Discriminator(_axis_form)
SpectrumAxis = Annotated[
    Annotated[SpectrumRange, Tag("a range")]
    | Annotated[SpectrumValues, Tag("values")]
    | Annotated[SpectralPoint, Tag("one value")],
    _FORM,
]
AngleAxis = Annotated[
    Annotated[AngleRange, Tag("a range")]
    | Annotated[AngleValues, Tag("values")]
    | Annotated[PolarAngle, Tag("one value")],
    _FORM,
]
AzimuthAxis = Annotated[
    Annotated[AzimuthRange, Tag("a range")]
    | Annotated[AzimuthValues, Tag("values")]
    | Annotated[AzimuthAngle, Tag("one value")],
    _FORM,
]
PolarizationWord = Literal["TE", "TM"]
StoredWord = Literal["power", "amplitude"]
Polarization = Annotated[
    Annotated[PolarizationWord, Tag("one value")]
    | Annotated[list[PolarizationWord], Field(min_length=1), Tag("a list")],
    Discriminator(lambda value: "a list" if form_of(value) == "a list" else "one value"),
]


class SweepTable(FileTable):
    """The grid over which the stack is solved."""

    spectrum: SpectrumAxis = Field(
        description='{ from = "5 GHz", to = "40 GHz", points = 351 }, { values = ["5 GHz"] }, or one value'
    )
    angle: AngleAxis = Field(description='Polar angles: { from = "0 deg", to = "80 deg", points = 81 }, or one value')
    azimuth: AzimuthAxis = Field(
        default_factory=lambda: Quantity(0.0, "deg"), description='Azimuths from x; default "0 deg"'
    )
    polarization: Polarization = Field(["TE", "TM"], description='"TE", "TM", or both (default)')
    model: Literal["nonlocal", "local"] = Field("nonlocal", description='Wire model, "nonlocal" by default')
    store: list[StoredWord] = Field(["power", "amplitude"], min_length=1, description="What the map keeps")

    @field_validator("polarization", "store")
    @classmethod
    def _distinct(cls, value: Any) -> Any:
        if isinstance(value, list) and len(set(value)) != len(value):
            raise complaint("the same word twice; name each once")
        return value


def frequencies(axis: SpectrumRange | SpectrumValues | Quantity) -> np.ndarray:
    """Points of a spectral axis: frequencies [Hz], ascending."""
    if isinstance(axis, SpectrumRange):
        if spectral_kind(axis.start.unit) == "wavelength":
            return np.sort(to_hz(axis.spaced(to_si(*axis.start), to_si(*axis.stop)), "m"))
        return np.sort(axis.spaced(to_hz(*axis.start), to_hz(*axis.stop)))
    points = axis.values if isinstance(axis, SpectrumValues) else [axis]
    return np.sort([to_hz(*point) for point in points])


def spectral_unit(axis: SpectrumRange | SpectrumValues | Quantity) -> str:
    """Unit in which the first value of a spectral axis is written."""
    if isinstance(axis, SpectrumRange):
        return axis.start.unit
    return axis.values[0].unit if isinstance(axis, SpectrumValues) else axis.unit


def angles_deg(axis: AngleRange | AzimuthRange | AngleValues | AzimuthValues | Quantity) -> np.ndarray:
    """Points of an axis of angles [degrees], ascending."""
    if isinstance(axis, AngleRange | AzimuthRange):
        return np.sort(axis.spaced(degrees(axis.start), degrees(axis.stop)))
    points = axis.values if isinstance(axis, AngleValues | AzimuthValues) else [axis]
    return np.sort([degrees(point) for point in points])


def _refuse_twins(values: list[Quantity], numbers: list[float]) -> list[Quantity]:
    for first, second in pairwise(np.argsort(numbers, kind="stable")):
        if numbers[first] == numbers[second]:
            raise complaint(f"{_written(values[first])} and {_written(values[second])} are the same point twice")
    return values
