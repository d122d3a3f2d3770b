"""The sample: what a stack file describes, checked, in SI units, immutable.

A stack is a sequence of elements from front to back:

    incident wave -> | layer | sheet | layer | ... | -> back half-space or conductor

An element is a `Layer` (with or without wires), a sheet of zero thickness (`Patches`, `Strips`,
`Film`), or a `Group` of elements that is repeated. `flatten` writes the groups out.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Literal

if TYPE_CHECKING:
    import numpy as np

    from slabsim.materials.material import Material

Model = Literal["nonlocal", "local"]
Polarization = Literal["TE", "TM"]
Stored = Literal["power", "amplitude"]
PlasmaFormula = Literal["lattice", "logarithmic", "gap"]


@dataclass(frozen=True)
class SeriesLoad:
    """Resistance [ohm], inductance [H] and capacitance [F] in series; `capacitance` None is a short."""

    resistance: float = 0.0
    inductance: float = 0.0
    capacitance: float | None = None


@dataclass(frozen=True)
class WireEnd:
    """How a wire ends at one face of its layer.

    Parameters
    ----------
    kind : {"open", "grounded", "joined"}
        Nothing there; a conductor at that face; the wire of the neighbouring layer.
    load : SeriesLoad, optional
        Between the wire and the conductor ("grounded"), or in series in the joint ("joined").
    """

    kind: Literal["open", "grounded", "joined"]
    load: SeriesLoad | None = None


@dataclass(frozen=True)
class WireSet:
    """Parallel wires along z, one per cell of `pitch[0]` by `pitch[1]`.

    Parameters
    ----------
    pitch : tuple of float
        Sides of the rectangular cell [m].
    radius : float
        Wire radius [m].
    metal : Material or None
        None is a perfect conductor.
    ends : tuple of WireEnd
        Front and back.
    plasma : {"lattice", "logarithmic", "gap"} or float
        Formula of the plasma wavenumber, or the plasma frequency in the host [Hz].
    """

    pitch: tuple[float, float]
    radius: float
    metal: Material | None
    ends: tuple[WireEnd, WireEnd]
    plasma: PlasmaFormula | float = "lattice"


@dataclass(frozen=True)
class Layer:
    """A homogeneous layer, `thickness` [m], with wires or without."""

    name: str
    material: Material
    thickness: float
    wires: WireSet | None = None


@dataclass(frozen=True)
class Patches:
    """A sheet of square conducting patches, `period` and `gap` [m]."""

    name: str
    period: float
    gap: float


@dataclass(frozen=True)
class Strips:
    """A sheet of crossed conducting strips (a square grid), `period` and strip `width` [m]."""

    name: str
    period: float
    width: float


@dataclass(frozen=True)
class Film:
    """A resistive film: `sheet_resistance` [ohm], or a `metal` (its conductivity) and a `thickness` [m].

    Exactly one of the two forms is given; the other's fields are None.
    """

    name: str
    sheet_resistance: float | None = None
    conductivity: float | None = None
    thickness: float | None = None


Sheet = Patches | Strips | Film


@dataclass(frozen=True)
class Group:
    """Elements repeated `repeat` times, front to back."""

    repeat: int
    elements: tuple[Element, ...]


Element = Layer | Patches | Strips | Film | Group


@dataclass(frozen=True)
class Sweep:
    """The grid of a sweep and what is kept of it.

    Parameters
    ----------
    frequencies : float array, shape (n_freqs,)
        Ascending [Hz].
    angles_deg, azimuths_deg : float array, shape (n_angles,), (n_azimuths,)
        Polar angles of incidence, 0 <= angle < 90; azimuths [degrees].
    polarizations : tuple of {"TE", "TM"}
    model : {"nonlocal", "local"}
    store : tuple of {"power", "amplitude"}
    spectral_unit : str
        Unit the spectrum was written in; reports use it.
    """

    frequencies: np.ndarray
    angles_deg: np.ndarray
    azimuths_deg: np.ndarray
    polarizations: tuple[Polarization, ...] = ("TE", "TM")
    model: Model = "nonlocal"
    store: tuple[Stored, ...] = ("power", "amplitude")
    spectral_unit: str = "GHz"


@dataclass(frozen=True)
class Stack:
    """A sample, its surroundings and the sweep asked for.

    Parameters
    ----------
    front : Material
        Half-space of incidence, lossless.
    back : Material or None
        Half-space behind; None is a perfect conductor.
    elements : tuple of Element
        Front to back.
    sweep : Sweep
    text : str
        The stack file, verbatim.
    file_name : str
        Its name without the folder.
    tables : dict of str to str
        Name and text of every table file the stack refers to.
    """

    title: str
    front: Material
    back: Material | None
    elements: tuple[Element, ...]
    sweep: Sweep
    text: str = ""
    file_name: str = "stack.toml"
    tables: dict[str, str] = field(default_factory=dict)

    def flatten(self) -> tuple[Layer | Sheet, ...]:
        """Layers and sheets from front to back, groups written out."""
        return tuple(_walk(self.elements))


def _walk(elements: tuple[Element, ...]) -> Iterator[Layer | Sheet]:
    for element in elements:
        if isinstance(element, Group):
            for _ in range(element.repeat):
                yield from _walk(element.elements)
        else:
            yield element
