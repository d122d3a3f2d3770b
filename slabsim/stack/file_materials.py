"""Tables `[material.name]` of a stack file."""

from typing import Annotated, Any, ClassVar

from pydantic import Discriminator, Field, Tag, ValidationInfo, field_validator, model_validator

from slabsim.materials.material import PASSIVE
from slabsim.stack.quantities import (
    Conductivity,
    Damping,
    FileTable,
    Length,
    Spectral,
    Time,
    complaint,
)

MODELS = ("drude", "lorentz", "debye", "sellmeier", "table")


def _passive(value: float, name: str) -> float:
    if value < 0.0:
        raise complaint(f"{value:g} would amplify; {name} must be zero or more: {PASSIVE}")
    return value


class DrudeTable(FileTable):
    """background - wp^2/(w^2 + i w g)."""

    plasma: Spectral = Field(description='Plasma frequency wp, such as "1.37e16 rad/s" or "72800 cm^-1"')
    collision: Damping = Field(description='Collision frequency g, such as "4.05e13 rad/s" or "215 cm^-1"')
    background: float = Field(1.0, description="Permittivity far above the plasma frequency")


class OscillatorTable(FileTable):
    """strength f0^2/(f0^2 - f^2 - i f G)."""

    resonance: Spectral = Field(description='Resonance frequency f0, such as "1 THz"')
    strength: float = Field(description="Its share of the static permittivity, zero or more")
    damping: Damping = Field(description='Width G, such as "20 GHz"')

    @field_validator("strength")
    @classmethod
    def _strength_is_passive(cls, value: float) -> float:
        return _passive(value, "the strength")


class LorentzTable(FileTable):
    """background + sum of the oscillators."""

    background: float = Field(1.0, description="Permittivity far above all resonances")
    oscillators: list[OscillatorTable] = Field(min_length=1, description="One table for each resonance")


class DebyeTable(FileTable):
    """infinity + (static - infinity)/(1 - i w tau)."""

    infinity: float = Field(description="Permittivity far above the relaxation")
    static: float = Field(description="Permittivity at zero frequency, not below infinity")
    relaxation: Time = Field(description='Relaxation time tau, such as "8.3 ps"')

    @field_validator("static")
    @classmethod
    def _static_is_passive(cls, value: float, info: ValidationInfo) -> float:
        infinity = info.data.get("infinity", value)
        if value < infinity:
            raise complaint(f"{value:g} below infinity = {infinity:g} would amplify: {PASSIVE}")
        return value


class SellmeierTable(FileTable):
    """n^2 = 1 + sum B l^2/(l^2 - C^2), l the vacuum wavelength."""

    B: list[float] = Field(min_length=1, description="Coefficients B")
    C: list[Length] = Field(description='Resonance wavelengths C, as many as B, such as "0.068 um"')
    range: list[Length] | None = Field(
        None,
        min_length=2,
        max_length=2,
        description='Shortest and longest wavelength, ["0.21 um", "3.71 um"]',
    )

    @field_validator("C")
    @classmethod
    def _as_many_as_b(cls, value: list[float], info: ValidationInfo) -> list[float]:
        strengths = info.data.get("B", value)
        if len(value) != len(strengths):
            raise complaint(f"{len(value)} values, but B has {len(strengths)}; each B needs its C")
        return value

    @field_validator("range")
    @classmethod
    def _ascending(cls, value: list[float] | None) -> list[float] | None:
        if value is not None and value[0] >= value[1]:
            raise complaint("the first wavelength must be the shorter one")
        return value


class ResonanceTable(FileTable):
    """1 - F f^2/(f^2 - f0^2 + i G f)."""

    tag: ClassVar[str] = "a table"
    resonance: Spectral = Field(description='Resonance frequency f0, such as "10 GHz"')
    strength: float = Field(description="Strength F, the area share of the inclusions, zero or more")
    damping: Damping = Field(description='Damping G, such as "0.1 GHz"')

    @field_validator("strength")
    @classmethod
    def _strength_is_passive(cls, value: float) -> float:
        return _passive(value, "the strength")


def _number_or_table(value: Any) -> str:
    return "a table" if isinstance(value, dict | FileTable) else "a number"


def _magnetic_form(value: Any) -> str:
    # "x" for "xx" means axes too: so the fault names them, not the keys of a resonance
    has_axes = isinstance(value, MagneticAxesTable) or (
        isinstance(value, dict) and any(key[:1] in ("x", "y", "z") for key in value)
    )
    return "axes" if has_axes else _number_or_table(value)


class ElectricAxesTable(FileTable):
    """Relative permittivity along the axes of the layer."""

    tag: ClassVar[str] = "a table"
    xx: float = Field(description="Along x")
    yy: float = Field(description="Along y")
    zz: float = Field(description="Along z, across the layer")


_AxisPermeability = Annotated[
    Annotated[float, Tag("a number")] | Annotated[ResonanceTable, Tag("a table")],
    Discriminator(_number_or_table),
]


class MagneticAxesTable(FileTable):
    """Relative permeability along the axes of the layer, each a number or a resonance."""

    tag: ClassVar[str] = "axes"
    xx: _AxisPermeability = Field(description="Along x")
    yy: _AxisPermeability = Field(description="Along y")
    zz: _AxisPermeability = Field(description="Along z, across the layer")


Permittivity = Annotated[
    Annotated[float, Tag("a number")] | Annotated[ElectricAxesTable, Tag("a table")],
    Discriminator(_number_or_table),
]
Permeability = Annotated[
    Annotated[float, Tag("a number")]
    | Annotated[ResonanceTable, Tag("a table")]
    | Annotated[MagneticAxesTable, Tag("axes")],
    Discriminator(_magnetic_form),
]


class MaterialTable(FileTable):
    """One material: exactly one electric model, and a permeability if it is magnetic."""

    permittivity: Permittivity | None = Field(
        None, description="Relative permittivity, a plain number, or { xx = 2.1, yy = 2.1, zz = 2.4 }"
    )
    loss_tangent: float | None = Field(None, description="tan d of the permittivity, zero or more")
    conductivity: Conductivity | None = Field(None, description='DC conductivity, such as "5.8e7 S/m"')
    drude: DrudeTable | None = Field(None, description="Free electrons: background - wp^2/(w^2 + i w g)")
    lorentz: LorentzTable | None = Field(None, description="Bound resonances")
    debye: DebyeTable | None = Field(None, description="Relaxation of a polar medium")
    sellmeier: SellmeierTable | None = Field(None, description="Transparent medium")
    table: str | None = Field(
        None,
        description='File with a header "wavelength (um),n,k" or "frequency (THz),eps_re,eps_im"',
        min_length=1,
    )
    permeability: Permeability = Field(
        1.0, description="A plain number, a table with a resonance, or { xx, yy, zz } of these"
    )

    @field_validator("loss_tangent")
    @classmethod
    def _loss_is_passive(cls, value: float | None) -> float | None:
        return None if value is None else _passive(value, "the loss tangent")

    @model_validator(mode="after")
    def _one_electric_model(self) -> "MaterialTable":
        given = [name for name in MODELS if getattr(self, name) is not None]
        if self.permittivity is not None or self.conductivity is not None:
            given.insert(0, "permittivity" if self.permittivity is not None else "conductivity")
        if self.loss_tangent is not None and self.permittivity is None:
            raise complaint("loss_tangent belongs to a permittivity; add permittivity = ...")
        if len(given) == 1:
            return self
        found = " and ".join(given) + " together" if given else "no permittivity"
        raise complaint(
            f"{found}; a material has exactly one of permittivity (with loss_tangent or conductivity if "
            f"lossy), conductivity, {', '.join(MODELS[:-1])} or {MODELS[-1]}"
        )
