"""The stack written out, and what it uses, read from the raw file as far as its parts are good."""

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any, Literal

from pydantic import ValidationError

from slabsim.stack.complaints import Complaints
from slabsim.stack.file_layers import MAX_ELEMENTS, WireTable, entry_shape
from slabsim.stack.joints import Place
from slabsim.stack.lines import Path


@dataclass(frozen=True)
class Use:
    """A material named somewhere in the file, and as what."""

    path: Path
    name: str
    role: Literal["front", "back", "host", "metal"]


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
    for wires_path, wires in _entries(entry.get("wires"), (*path, "wires")):
        if isinstance(wires.get("metal"), str):
            yield Use((*wires_path, "metal"), wires["metal"], "metal")
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
    if shape != "layer" or "wires" not in entry:
        return [Place(path, shape)]
    wires = _wires(entry)
    return [Place(path, "layer" if wires else "unknown", wires)]


def _wires(entry: dict[str, Any]) -> WireTable | None:
    sets = entry["wires"]
    try:
        return WireTable.model_validate(sets[0]) if isinstance(sets, list) and len(sets) == 1 else None
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
