"""The sample: what a stack file describes, checked, in SI units, immutable.

A stack is a sequence of elements from front to back:

    incident wave -> | layer | sheet | layer | ... | -> back half-space or conductor

An element is a `Layer` (with or without wires), a layer of `Plates`, a sheet of zero thickness (`Patches`,
`Strips`, `Film`, `Grid`), or a `Group` of elements that is repeated. `flatten` writes the groups out.
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
Channel = Literal["TE", "TM", "TE_to_TM", "TM_to_TE"]
Stored = Literal["power", "amplitude"]
PlasmaFormula = Literal["lattice", "logarithmic", "gap"]
Inductance = Literal["vacuum", "host"]
Direction = tuple[float, float, float]
_CROSS: dict[Polarization, Channel] = {"TE": "TE_to_TM", "TM": "TM_to_TE"}
ALONG_Z: Direction = (0.0, 0.0, 1.0)


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
    """Parallel wires, one per cell of `pitch[0]` by `pitch[1]` across the wires.

    Parameters
    ----------
    pitch : tuple of float
        Sides of the rectangular cell [m].
    radius : float
        Wire radius [m].
    metal : Material or None
        None is a perfect conductor.
    ends : tuple of WireEnd
        Front and back; without meaning for wires parallel to the faces.
    plasma : {"lattice", "logarithmic", "gap"} or float
        Formula of the plasma wavenumber, or the plasma frequency in the host [Hz].
    direction : tuple of float
        Unit vector along the wires, with a z component >= 0; exactly 0 for wires parallel to the faces.
    inductance : {"vacuum", "host"}
        Permeability that the magnetic field around a wire meets.
    """

    pitch: tuple[float, float]
    radius: float
    metal: Material | None
    ends: tuple[WireEnd, WireEnd]
    plasma: PlasmaFormula | float = "lattice"
    direction: Direction = ALONG_Z
    inductance: Inductance = "vacuum"

    @property
    def is_normal(self) -> bool:
        """Whether the wires stand at right angles on the faces."""
        return self.direction == ALONG_Z

    @property
    def crosses_faces(self) -> bool:
        """Whether the wires end at the faces, rather than lie parallel to them."""
        return self.direction[2] > 0.0


@dataclass(frozen=True)
class Mesh:
    """Three orthogonal sets of wires along x, y and z, joined where they meet.

    Parameters
    ----------
    pitch : float
        Side of the cubic cell [m].
    radius : float
        Wire radius [m].
    metal : Material or None
        None is a perfect conductor.
    ends : tuple of WireEnd
        Of the wires along z, front and back.
    plasma : {"lattice", "logarithmic", "gap"} or float
        Of one set, as in `WireSet`.
    stiffness : float or None
        l0, the capacitance of the joined sets over that of one; None takes the formula for thin wires.
    inductance : {"vacuum", "host"}
    """

    pitch: float
    radius: float
    metal: Material | None
    ends: tuple[WireEnd, WireEnd]
    plasma: PlasmaFormula | float = "lattice"
    stiffness: float | None = None
    inductance: Inductance = "vacuum"


@dataclass(frozen=True)
class Layer:
    """A homogeneous layer, `thickness` [m], with sets of wires, with a mesh, or with neither.

    `rotation` [rad] turns the axes of the material, of the wires and of the mesh about z.
    """

    name: str
    material: Material
    thickness: float
    wires: tuple[WireSet, ...] = ()
    mesh: Mesh | None = None
    rotation: float = 0.0

    @property
    def has_wires(self) -> bool:
        """Whether there are wires of any kind."""
        return bool(self.wires) or self.mesh is not None


@dataclass(frozen=True)
class Plates:
    """Thin, perfectly conducting parallel plates at right angles to the faces: `thickness`, `spacing` [m].

    The plates are normal to x or to y; `filling` is the isotropic material between them.
    """

    name: str
    thickness: float
    spacing: float
    normal: Literal["x", "y"]
    filling: Material


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


@dataclass(frozen=True)
class Grid:
    """One plane of parallel wires at `pitch` [m], along the unit vector `direction` parallel to the faces.

    `metal` None is a perfect conductor.
    """

    name: str
    pitch: float
    radius: float
    metal: Material | None
    direction: Direction


Sheet = Patches | Strips | Film | Grid


@dataclass(frozen=True)
class Group:
    """Elements repeated `repeat` times, front to back."""

    repeat: int
    elements: tuple[Element, ...]


Element = Layer | Plates | Patches | Strips | Film | Grid | Group


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

    def flatten(self) -> tuple[Layer | Plates | Sheet, ...]:
        """Layers and sheets from front to back, groups written out."""
        return tuple(_walk(self.elements))

    @property
    def mixes_polarizations(self) -> bool:
        """Whether TE may turn into TM and back: some element tells one direction parallel to the faces from another."""
        return any(_tells_directions(element) for element in self.flatten())

    @property
    def depends_on_azimuth(self) -> bool:
        """Whether the response may differ from one azimuth to another."""
        return self.mixes_polarizations or any(isinstance(element, Plates) for element in self.flatten())

    @property
    def channels(self) -> tuple[Channel, ...]:
        """What r and t are solved for: the sweep's polarizations, and if the stack mixes them the cross terms."""
        return self.channels_of(self.sweep.polarizations)

    def channels_of(self, incident: tuple[Polarization, ...]) -> tuple[Channel, ...]:
        """The same for other incident polarizations."""
        return (*incident, *(_CROSS[one] for one in incident if self.mixes_polarizations))


def _tells_directions(element: Layer | Plates | Sheet) -> bool:
    if isinstance(element, Layer):
        return element.material.tells_directions or not all(wires.is_normal for wires in element.wires)
    return isinstance(element, Grid)  # plates are solved along and across only, where they do not mix


def _walk(elements: tuple[Element, ...]) -> Iterator[Layer | Plates | Sheet]:
    for element in elements:
        if isinstance(element, Group):
            for _ in range(element.repeat):
                yield from _walk(element.elements)
        else:
            yield element
