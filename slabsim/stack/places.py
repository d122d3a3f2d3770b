"""The stack written out, and what it uses, read from the raw file as far as its parts are good."""

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any, Literal, TypeGuard

from pydantic import TypeAdapter, ValidationError

from slabsim.stack.complaints import Complaints
from slabsim.stack.file_layers import MAX_ELEMENTS, entry_shape
from slabsim.stack.file_sweep import AzimuthAngle, degrees
from slabsim.stack.file_wires import GridData, MeshTable, WireTable
from slabsim.stack.joints import EndedWires, Place
from slabsim.stack.lines import Path


@dataclass(frozen=True)
class Use:
    """A material named somewhere in the file, and as what."""

    path: Path
    name: str
    role: Literal["front", "back", "host", "metal", "filling"]


Wires = WireTable | MeshTable | GridData
_ROTATION: TypeAdapter[Any] = TypeAdapter(AzimuthAngle)


def written_out(raw: dict[str, Any], complaints: Complaints) -> list[Place]:
    """Layers and sheets from front to back, groups repeated; empty if there are too many."""
    entries = _entries(raw.get("layer"), ("layer",))
    total = sum(_count(entry) for _, entry in entries)
    if total > MAX_ELEMENTS:
        complaints.add(("layer",), f"{total} layers and sheets, groups written out; at most {MAX_ELEMENTS} are allowed")
        return []
    return [place for path, entry in entries for place in _places(path, entry)]


def uses(raw: dict[str, Any]) -> Iterator[Use]:
    """Every material that the file names, in its order."""
    for role in ("front", "back"):
        if isinstance(raw.get(role), str):
            yield Use((role,), raw[role], role)
    for path, entry in _entries(raw.get("layer"), ("layer",)):
        yield from _entry_uses(path, entry)


def _entry_uses(path: Path, entry: dict[str, Any]) -> Iterator[Use]:
    if isinstance(entry.get("material"), str):
        yield Use((*path, "material"), entry["material"], "host")
    for wires_path, wires in _wire_entries(path, entry):
        if isinstance(wires.get("metal"), str):
            yield Use((*wires_path, "metal"), wires["metal"], "metal")
    plates = entry.get("plates")
    if isinstance(plates, dict) and isinstance(plates.get("filling"), str):
        yield Use((*path, "plates", "filling"), plates["filling"], "filling")
    for inner_path, inner in _entries(entry.get("layers"), (*path, "layers")):
        yield from _entry_uses(inner_path, inner)


def _places(path: Path, entry: dict[str, Any]) -> list[Place]:
    shape = entry_shape(entry)
    if shape == "group":
        once = [
            place
            for inner_path, inner in _entries(entry.get("layers"), (*path, "layers"))
            for place in _places(inner_path, inner)
        ]
        return once * _repeat(entry) if _is_good(entry) else [Place(path, "unknown")]
    if shape is None:
        return [Place(path, "unknown")]
    if shape != "layer" or not ("wires" in entry or "mesh" in entry):
        return [Place(path, shape)]
    tables = [(place[len(path) :], _validated(place, one)) for place, one in _wire_entries(path, entry)]
    rotation = _rotation(entry)
    if rotation is None or not tables or any(table is None for _, table in tables):
        return [Place(path, "unknown")]
    wires = [EndedWires.of(place, table, rotation) for place, table in tables if _ends(table)]
    return [Place(path, "layer", tuple(wires))]


def wire_tables(raw: dict[str, Any]) -> Iterator[tuple[Path, Path | None, Wires]]:
    """Every set of wires, mesh and grid without a fault: its path, that of its layer (None of a grid), its table."""
    for path, entry in _layer_entries(raw.get("layer"), ("layer",)):
        for place, one in _wire_entries(path, entry):
            table = _validated(place, one)
            if table is not None:
                yield place, None if isinstance(table, GridData) else path, table


def has_plates(raw: dict[str, Any]) -> bool:
    """Whether some layer consists of plates."""
    return any("plates" in entry for _, entry in _layer_entries(raw.get("layer"), ("layer",)))


def _layer_entries(entries: Any, path: Path) -> Iterator[tuple[Path, dict[str, Any]]]:
    for place, entry in _entries(entries, path):
        yield place, entry
        yield from _layer_entries(entry.get("layers"), (*place, "layers"))


def _wire_entries(path: Path, entry: dict[str, Any]) -> list[tuple[Path, dict[str, Any]]]:
    """Tables of wires in one entry."""
    single = [((*path, key), entry[key]) for key in ("mesh", "grid") if isinstance(entry.get(key), dict)]
    return _entries(entry.get("wires"), (*path, "wires")) + single


def _validated(path: Path, raw: dict[str, Any]) -> Wires | None:
    kinds: dict[str | int, type[Wires]] = {"mesh": MeshTable, "grid": GridData}
    kind = kinds.get(path[-1], WireTable)
    try:
        return kind.model_validate(raw)
    except ValidationError:
        return None


def _ends(table: Wires | None) -> TypeGuard[WireTable | MeshTable]:
    """Whether these are wires that end at the faces."""
    return isinstance(table, WireTable | MeshTable) and table.direction[2] > 0.0


def _rotation(entry: dict[str, Any]) -> float | None:
    try:
        return degrees(_ROTATION.validate_python(entry["rotation"])) if "rotation" in entry else 0.0
    except ValidationError:
        return None


def _count(entry: dict[str, Any]) -> int:
    if entry_shape(entry) != "group":
        return 1
    return _repeat(entry) * max(1, sum(_count(inner) for _, inner in _entries(entry.get("layers"), ())))


def _repeat(group: dict[str, Any]) -> int:
    repeat = group.get("repeat")
    return max(repeat, 1) if isinstance(repeat, int) else 1


def _is_good(group: dict[str, Any]) -> bool:
    repeat, layers = group.get("repeat"), group.get("layers")
    return isinstance(repeat, int) and repeat >= 1 and isinstance(layers, list) and len(layers) > 0


def _entries(tables: Any, path: Path) -> list[tuple[Path, dict[str, Any]]]:
    """The tables of an array with their paths; what is no table has its own fault and is left out."""
    items = tables if isinstance(tables, list) else []
    return [((*path, index), item) for index, item in enumerate(items) if isinstance(item, dict)]
