"""What each wire end meets at its face, and whether that can be.

Sheets have no thickness, so all sheets between two layers lie in one plane:

    layer | patches, strips | layer        the back face of the left layer: two sheets, then a layer
"""

from dataclasses import dataclass
from math import atan2, hypot
from math import degrees as to_degrees
from typing import Literal

from slabsim.stack.complaints import Complaints
from slabsim.stack.directions import cos_sin_deg
from slabsim.stack.file_wires import LoadTable, MeshTable, WireTable
from slabsim.stack.lines import Path
from slabsim.stack.sample import Direction
from slabsim.units import format_length

EndKind = Literal["open", "grounded", "joined"]
Shape = Literal["layer", "plates", "patches", "strips", "film", "grid", "unknown"]
_SHEETS = ("patches", "strips", "film", "grid")
_SIDES = ("front", "back")
_SAME = 1e-9  # components of two directions that differ by less are equal
_GROUP_CURE = (
    "; the repeats of a group are all alike: write the layers that differ, often the first and the last "
    "repeat, out as entries of their own"
)


@dataclass(frozen=True)
class EndedWires:
    """Wires that end at the faces of a layer: a set, or those along z of a mesh.

    Parameters
    ----------
    path : Path
        Where the file describes them, from the layer on: ("wires", 0) or ("mesh",).
    table : WireTable or MeshTable
    direction : Direction
        Along the wires, the rotation of the layer included.
    """

    path: Path
    table: WireTable | MeshTable
    direction: Direction

    @classmethod
    def of(cls, path: Path, table: WireTable | MeshTable, rotation_deg: float) -> "EndedWires":
        """Wires of a layer that is turned about z."""
        c, s = cos_sin_deg(rotation_deg)
        x, y, z = table.direction
        return cls(path, table, (x * c - y * s, x * s + y * c, z))

    def runs_like(self, other: "EndedWires") -> bool:
        """Whether both have one direction."""
        return all(abs(a - b) < _SAME for a, b in zip(self.direction, other.direction, strict=True))

    def fits(self, other: "EndedWires") -> bool:
        """Whether both have one direction and one cell."""
        return self.runs_like(other) and self.table.cell == other.table.cell

    def goes_on(self, side: int) -> bool:
        """Whether the end at a face without a conductor is a joint: "joined" or a load."""
        return self.table.ends[side] == "joined" or isinstance(self.table.ends[side], LoadTable)


@dataclass(frozen=True)
class Place:
    """One layer or sheet of the written-out stack.

    Parameters
    ----------
    path : Path
        Where the file describes it; repeats of a group share it.
    shape : str
        "unknown" if a fault in the file hides it.
    wires : tuple of EndedWires
        The wires of a layer that end at its faces.
    """

    path: Path
    shape: Shape
    wires: tuple[EndedWires, ...] = ()

    @property
    def is_in_group(self) -> bool:
        """Whether a group repeats it."""
        return len(self.path) > 2


@dataclass(frozen=True)
class _Face:
    """What lies beyond one face of a layer, for one set of its wires: sheets, then a layer or (None) a half-space."""

    sheets: tuple[Place, ...]
    beyond: Place | None
    is_backed: bool
    side: int  # 0 front, 1 back
    partner: EndedWires | None  # wires of the next layer that these go on in, or would if they fitted

    @property
    def has_conductor(self) -> bool:
        return self.is_backed or any(sheet.shape in ("patches", "film") for sheet in self.sheets)

    @property
    def facing_end(self) -> str | LoadTable | None:
        """The wire end that looks at this face from the next layer."""
        return self.partner.table.ends[1 - self.side] if self.partner else None


def resolve_ends(places: list[Place], is_backed: bool, complaints: Complaints) -> dict[Path, EndKind]:
    """Kind of every wire end.

    Parameters
    ----------
    places : list of Place
        Front to back, groups written out.
    is_backed : bool
        Whether the back half-space is a perfect conductor.
    complaints : Complaints
        Takes what cannot be.

    Returns
    -------
    dict of path to {"open", "grounded", "joined"}
        By the path of the end; a load becomes "grounded" or "joined", whichever the face offers.
    """
    kinds: dict[Path, EndKind] = {}
    for index, place in enumerate(places):
        cure = _GROUP_CURE if place.is_in_group else ""
        for wires in place.wires:
            for side in (0, 1):
                path = (*place.path, *wires.path, "ends", side)
                try:
                    kind = _kind_of(wires, _face(places, index, side, is_backed, wires))
                except _ImpossibleEndError as impossible:
                    complaints.add(path, f"{impossible}{cure}")
                    continue
                if kind is not None and kinds.setdefault(path, kind) != kind:
                    complaints.add(path, f"the load is {kinds[path]} in one repeat and {kind} in another{cure}")
    return kinds


class _ImpossibleEndError(Exception):
    """Says why a wire cannot end so."""


def _face(places: list[Place], index: int, side: int, is_backed: bool, wires: EndedWires) -> _Face:
    step, own = (1 if side else -1), places[index]
    sheets = []
    index += step
    while 0 <= index < len(places) and places[index].shape in _SHEETS:
        sheets.append(places[index])
        index += step
    beyond = places[index] if 0 <= index < len(places) else None
    partner = _partner(own, wires, beyond, side) if beyond is not None and not sheets else None
    return _Face(tuple(sheets), beyond, is_backed and side == 1 and beyond is None, side, partner)


def _partner(own: Place, wires: EndedWires, beyond: Place, side: int) -> EndedWires | None:
    """The set that these wires go on in: of several that fit, joined sets pair off in the order of the file.

    Without one, the set that comes nearest, for the message: one that fits but is open, one of that direction, any.
    """
    if not wires.goes_on(side):
        return None
    fitting = [other for other in beyond.wires if wires.fits(other)]
    facing = [other for other in fitting if other.goes_on(1 - side)]
    rank = [other for other in own.wires if wires.fits(other) and other.goes_on(side)].index(wires)
    if rank < len(facing):
        return facing[rank]
    idle = [other for other in fitting if not other.goes_on(1 - side)]
    if facing and not idle:
        raise _ImpossibleEndError(
            "joined, but every set of this direction and cell in the next layer is joined to another set already; "
            "each set needs a partner of its own"
        )
    nearest = idle or [other for other in beyond.wires if wires.runs_like(other)] or list(beyond.wires)
    return nearest[0] if nearest else None


def _kind_of(wires: EndedWires, face: _Face) -> EndKind | None:
    """None where a fault elsewhere in the file hides the answer."""
    end = wires.table.ends[face.side]
    if end == "open":
        return "open"
    if face.has_conductor and end != "joined":
        return "grounded"
    if face.beyond is not None and face.beyond.shape == "unknown":
        return None
    if end == "grounded":
        raise _ImpossibleEndError(f'"grounded" needs a conductor at this face, {_conductors(face)}; {_seen(face)}')
    if end == "joined":
        _check_joint(wires, face)
    elif face.facing_end == "joined":
        _check_cells(wires, face)
    else:
        _refuse_load(face)
    return "joined"


def _check_joint(wires: EndedWires, face: _Face) -> None:
    if face.sheets:
        cure = 'use "grounded" on both sides' if face.has_conductor else 'use "open" on both sides'
        raise _ImpossibleEndError(
            f'"joined", but a sheet ({face.sheets[0].shape}) lies between, which wires do not cross; {cure}'
        )
    if face.facing_end is None:
        raise _ImpossibleEndError(f'"joined" needs wires in the next layer that end at this face; {_seen(face)}')
    if face.facing_end in ("open", "grounded"):
        raise _ImpossibleEndError(
            f'"joined", but the end of the next layer\'s wires that faces it is "{face.facing_end}"; '
            'it must be "joined" or a load'
        )
    # both ends of a joint see the same difference: one fault is enough
    if face.side == 1 or face.facing_end != "joined":
        _check_cells(wires, face)


def _check_cells(wires: EndedWires, face: _Face) -> None:
    other = face.partner
    if other is None:
        return
    if not wires.runs_like(other):
        raise _ImpossibleEndError(
            f"joined to wires of another direction: {_direction(wires)} here, {_direction(other)} there; "
            "joined wires need the same axis, the rotation of their layers included"
        )
    if other.table.cell != wires.table.cell:
        raise _ImpossibleEndError(
            f"joined to wires of another cell: {_cell(wires)} here, {_cell(other)} there; "
            "joined wires need the same pitch"
        )


def _refuse_load(face: _Face) -> None:
    if isinstance(face.facing_end, LoadTable):
        raise _ImpossibleEndError('a load faces a load; write one of the two ends as "joined"')
    raise _ImpossibleEndError(
        f"a load needs a conductor at this face, {_conductors(face)}, "
        f'or a facing end "joined" in the next layer; {_seen(face)}'
    )


def _conductors(face: _Face) -> str:
    backing = ' or back = "perfect conductor"' if face.side == 1 and face.beyond is None else ""
    return f"patches or a film{backing}"


def _seen(face: _Face) -> str:
    names = dict.fromkeys("strips" if sheet.shape == "strips" else "a grid" for sheet in face.sheets)
    idle = f"{' and '.join(names)}, which {'do' if 'strips' in names else 'does'} not count, and " if names else ""
    if face.beyond is None:
        what = f"the {_SIDES[face.side]} half-space"
    elif face.beyond.shape == "plates":
        what = "a layer of plates"
    else:
        what = "a layer with wires" if face.beyond.wires else "a layer without wires that end there"
    return f"here {'are' if 'strips' in names else 'is'} {idle}{what}"


def _cell(wires: EndedWires) -> str:
    return " by ".join(format_length(side) for side in wires.table.cell)


def _direction(wires: EndedWires) -> str:
    x, y, z = wires.direction
    tilt = to_degrees(atan2(hypot(x, y), z))
    return f"tilt {tilt:.4g} deg" + (f", azimuth {to_degrees(atan2(y, x)):.4g} deg" if tilt > 0.0 else "")
