"""What each wire end meets at its face, and whether that can be.

Sheets have no thickness, so all sheets between two layers lie in one plane:

    layer | patches, strips | layer        the back face of the left layer: two sheets, then a layer
"""

from dataclasses import dataclass
from typing import Literal

from slabsim.stack.complaints import Complaints
from slabsim.stack.file_layers import LoadTable, WireTable
from slabsim.stack.lines import Path
from slabsim.units import format_length

EndKind = Literal["open", "grounded", "joined"]
Shape = Literal["layer", "patches", "strips", "film", "unknown"]
_SIDES = ("front", "back")
_GROUP_CURE = (
    "; the repeats of a group are all alike: write the layers that differ, often the first and the last "
    "repeat, out as entries of their own"
)


@dataclass(frozen=True)
class Place:
    """One layer or sheet of the written-out stack.

    Parameters
    ----------
    path : Path
        Where the file describes it; repeats of a group share it.
    shape : str
        "unknown" if a fault in the file hides it.
    wires : WireTable, optional
        The wires of a layer.
    """

    path: Path
    shape: Shape
    wires: WireTable | None = None

    @property
    def is_in_group(self) -> bool:
        """Whether a group repeats it."""
        return len(self.path) > 2


@dataclass(frozen=True)
class _Face:
    """What lies beyond one face of a layer: sheets, then a layer or (None) a half-space."""

    sheets: tuple[Place, ...]
    beyond: Place | None
    is_backed: bool
    side: int  # 0 front, 1 back

    @property
    def has_conductor(self) -> bool:
        return self.is_backed or any(sheet.shape in ("patches", "film") for sheet in self.sheets)

    @property
    def facing_end(self) -> str | LoadTable | None:
        """The wire end that looks at this face from the next layer."""
        wires = self.beyond.wires if self.beyond and not self.sheets else None
        return wires.ends[1 - self.side] if wires else None


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
        for side in (0, 1) if place.wires else ():
            path = (*place.path, "wires", 0, "ends", side)
            cure = _GROUP_CURE if place.is_in_group else ""
            try:
                kind = _kind_of(place.wires, _face(places, index, side, is_backed))
            except _ImpossibleEndError as impossible:
                complaints.add(path, f"{impossible}{cure}")
                continue
            if kind is not None and kinds.setdefault(path, kind) != kind:
                complaints.add(path, f"the load is {kinds[path]} in one repeat and {kind} in another{cure}")
    return kinds


class _ImpossibleEndError(Exception):
    """Says why a wire cannot end so."""


def _face(places: list[Place], index: int, side: int, is_backed: bool) -> _Face:
    step = 1 if side else -1
    sheets = []
    index += step
    while 0 <= index < len(places) and places[index].shape in ("patches", "strips", "film"):
        sheets.append(places[index])
        index += step
    beyond = places[index] if 0 <= index < len(places) else None
    return _Face(tuple(sheets), beyond, is_backed and side == 1 and beyond is None, side)


def _kind_of(wires: WireTable | None, face: _Face) -> EndKind | None:
    """None where a fault elsewhere in the file hides the answer."""
    end = wires.ends[face.side] if wires else "open"
    if wires is None or end == "open":
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


def _check_joint(wires: WireTable, face: _Face) -> None:
    if face.sheets:
        cure = 'use "grounded" on both sides' if face.has_conductor else 'use "open" on both sides'
        raise _ImpossibleEndError(
            f'"joined", but a sheet ({face.sheets[0].shape}) lies between, which wires do not cross; {cure}'
        )
    if face.facing_end is None:
        raise _ImpossibleEndError(f'"joined" needs wires in the next layer; {_seen(face)}')
    if face.facing_end in ("open", "grounded"):
        raise _ImpossibleEndError(
            f'"joined", but the end of the next layer\'s wires that faces it is "{face.facing_end}"; '
            'it must be "joined" or a load'
        )
    # both ends of a joint see the same difference: one fault is enough
    if face.side == 1 or face.facing_end != "joined":
        _check_cells(wires, face)


def _check_cells(wires: WireTable, face: _Face) -> None:
    other = face.beyond.wires if face.beyond else None
    if other is not None and other.cell != wires.cell:
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
    strips = "strips, which do not count, and " if face.sheets else ""
    if face.beyond is None:
        return (
            f"here are {strips}the {_SIDES[face.side]} half-space"
            if strips
            else f"here is the {_SIDES[face.side]} half-space"
        )
    what = "a layer with wires" if face.beyond.wires else "a layer without wires"
    return f"here are {strips}{what}" if strips else f"here is {what}"


def _cell(wires: WireTable) -> str:
    return " by ".join(format_length(side) for side in wires.cell)
