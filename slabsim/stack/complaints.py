"""From the validator's errors to faults that a person can act on."""

import json
import re
import sys
from typing import Any, get_args

from pydantic import ValidationError
from pydantic.fields import FieldInfo
from pydantic_core import ErrorDetails

from slabsim.errors import Fault
from slabsim.stack.document import Document
from slabsim.stack.file_layers import entry_complaint
from slabsim.stack.lines import Path
from slabsim.stack.quantities import FileTable, suggestion

_TYPES = {
    "string_type": "text in quotes",
    "float_type": "a plain number without quotes",
    "int_type": "a whole number without quotes",
    "int_from_float": "a whole number without quotes",
    "finite_number": "a finite number",
    "list_type": "a list in brackets",
    "dict_type": "a table",
    "model_type": "a table { key = value, ... }",
    "model_attributes_type": "a table { key = value, ... }",
}
_NUMBERS = ("float_type", "int_type", "int_from_float")
_BOUNDS = {"greater_than_equal": "least", "less_than_equal": "most"}
_BOUND_KEYS = {"greater_than_equal": "ge", "less_than_equal": "le"}
_TABLE_ARRAYS = ("layer", "layers", "wires")
_NAMED_LISTS = ("layer", "layers")
_SWEEP_EXAMPLE = (
    "the file needs a table such as\n"
    "    [sweep]\n"
    '    spectrum = { from = "5 GHz", to = "40 GHz", points = 351 }\n'
    '    angle = { from = "0 deg", to = "80 deg", points = 81 }'
)


class Complaints:
    """Faults of one file, each with its key path and, where known, its line.

    Parameters
    ----------
    raw : dict
        The file as the TOML reader gives it.
    lines : dict of path to int
        Line of every key path.
    """

    def __init__(self, raw: dict[str, Any], lines: dict[Path, int]) -> None:
        self.raw = raw
        self.lines = lines
        self._found: dict[tuple[Path, str], Fault] = {}

    @property
    def faults(self) -> list[Fault]:
        """All faults, in the order of the file."""
        ordered = sorted(self._found.items(), key=lambda item: self._line_of(item[0][0]) or sys.maxsize)
        return [fault for _, fault in ordered]

    def add(self, path: Path, what: str) -> None:
        """Add a fault; the same one twice counts once."""
        line = self._line_of(path)
        where = key_path(self.raw, path)
        self._found.setdefault((path, what), Fault(f"line {line}, {where}" if line else where, what))

    def add_if(self, path: Path, what: str | None) -> None:
        """Add a fault if there is one."""
        if what is not None:
            self.add(path, what)

    def add_all(self, error: ValidationError) -> None:
        """Add every fault the validator found."""
        details = error.errors(include_url=False)
        unknown = [self._clean(one["loc"]) for one in details if one["type"] == "extra_forbidden"]
        for one in details:
            path = self._clean(one["loc"])
            if one["type"] == "missing" and _has_typo(path, unknown):
                continue
            self.add(path, self._explain(one, path))

    def _explain(self, error: ErrorDetails, path: Path) -> str:
        kind, value = error["type"], error["input"]
        context = error.get("ctx", {})
        match kind:
            case "slabsim":
                return context["text"]
            case "extra_forbidden":
                keys = allowed_keys(error["loc"][:-1])
                return "unknown key" + (suggestion(str(path[-1]), keys) or f"; allowed are {', '.join(keys)}")
            case "missing":
                return _missing(error["loc"])
            case "union_tag_not_found":
                return entry_complaint(value)
            case "literal_error":
                words = re.findall(r"'([^']*)'", context["expected"])
                hint = suggestion(value, words) if isinstance(value, str) else ""
                return f"{show(value)}; {_one_of(words)}{hint or _or_a_table(allowed_keys(error['loc']))}"
            case "too_short" | "too_long":
                return _wrong_length(error)
            case "list_type" if isinstance(value, dict) and path[-1] in _TABLE_ARRAYS:
                return f"a single table; its header takes two brackets, [[{_header(path)}]]"
        if kind in _TYPES:
            quotes = " (remove the quotes)" if kind in _NUMBERS and isinstance(value, str) else ""
            return f"{show(value)}; it must be {_TYPES[kind]}{quotes}"
        if kind in _BOUNDS:
            return f"{show(value)}; it must be at {_BOUNDS[kind]} {context[_BOUND_KEYS[kind]]}"
        return f"{show(value)}; {error['msg'].replace('Input should', 'it must')}"

    def _clean(self, location: tuple[str | int, ...]) -> Path:
        """Path in the file: without the names that the validator gives to the forms of a value."""
        path: list[str | int] = []
        value: Any = self.raw
        for depth, part in enumerate(location):
            last = depth == len(location) - 1
            if isinstance(value, dict) and part in value:
                path.append(part)
                value = value[str(part)]
            elif isinstance(value, list) and isinstance(part, int):
                path.append(part)
                value = value[part] if part < len(value) else None
            elif isinstance(value, dict) and last and isinstance(part, str) and part in allowed_keys(location[:-1]):
                path.append(part)
        return tuple(path)

    def _line_of(self, path: Path) -> int | None:
        while path and path not in self.lines:
            path = path[:-1]
        return self.lines.get(path)


def key_path(raw: dict[str, Any], path: Path) -> str:
    """A path as a person would say it: ``layer 2 "wire slab": wires 1: radius``."""
    words: list[str] = []
    value: Any = raw
    separator = ""
    for depth, part in enumerate(path):
        value = _step(value, part)
        if isinstance(part, int):
            name = value.get("name") if isinstance(value, dict) and path[depth - 1] in _NAMED_LISTS else None
            words.append(f" {part + 1}" + (f' "{name}"' if isinstance(name, str) and name else ""))
            separator = ": "
        else:
            words.append(f"{separator}{part}")
            separator = ": " if (depth == 0 and part == "sweep") or (depth == 1 and path[0] == "material") else "."
    return "".join(words)


def show(value: Any) -> str:
    """A value as it stands in the file, shortened."""
    if isinstance(value, dict):
        return "a table"
    text = json.dumps(value, ensure_ascii=False, default=str)
    return text if len(text) <= 60 else text[:57] + "..."


def allowed_keys(location: tuple[str | int, ...]) -> list[str]:
    """Keys of the table at a validator's location, as written in the file."""
    models, _ = _described(location)
    return list(dict.fromkeys(str(key) for model in models for key in _fields(model)))


def _described(location: tuple[str | int, ...]) -> tuple[list[type[FileTable]], FieldInfo | None]:
    """Tables that may stand at a validator's location, and the last field on the way."""
    models: list[type[FileTable]] = [Document]
    field = None
    for part in location:
        tagged = [model for model in models if model.tag == part]
        named = [_fields(model)[part] for model in models if part in _fields(model)]
        if tagged:
            models = tagged
        elif named:
            field = named[0]
            models = [model for one in named for model in _tables_in(one.annotation)]
    return models, field


def _fields(model: type[FileTable]) -> dict[str | int, FieldInfo]:
    return {field.alias or name: field for name, field in model.model_fields.items()}


def _tables_in(annotation: Any) -> list[type[FileTable]]:
    if isinstance(annotation, type) and issubclass(annotation, FileTable):
        return [annotation]
    return [model for part in get_args(annotation) for model in _tables_in(part)]


def _missing(location: tuple[str | int, ...]) -> str:
    if location == ("sweep",):
        return f"missing; {_SWEEP_EXAMPLE}"
    _, field = _described(location)
    return f"missing; {field.description}" if field is not None else "missing"


def _one_of(words: list[str]) -> str:
    quoted = [f'"{word}"' for word in words]
    return f"allowed is {quoted[0]}" if len(words) == 1 else f"allowed are {', '.join(quoted)}"


def _or_a_table(keys: list[str]) -> str:
    return f", or a table {{ {', '.join(keys)} }}" if keys else ""


def _header(path: Path) -> str:
    return ".".join(part for part in path if isinstance(part, str))


def _has_typo(missing: Path, unknown: list[Path]) -> bool:
    siblings = [path for path in unknown if path[:-1] == missing[:-1]]
    return any(suggestion(str(path[-1]), [str(missing[-1])]) for path in siblings)


def _wrong_length(error: ErrorDetails) -> str:
    count = error["ctx"]["actual_length"]
    limit = f"at least {error['ctx']['min_length']}" if error["type"] == "too_short" else None
    limit = limit or f"at most {error['ctx']['max_length']}"
    return f"{count} {'item' if count == 1 else 'items'}; it must have {limit}"


def _step(value: Any, part: str | int) -> Any:
    if isinstance(value, dict):
        return value.get(str(part))
    if isinstance(value, list) and isinstance(part, int) and part < len(value):
        return value[part]
    return None
