"""JSON schema of the stack file, for editors that check and complete TOML."""

from typing import Any

from slabsim.stack.document import Document

DIALECT = "https://json-schema.org/draft/2020-12/schema"


def stack_schema() -> dict[str, Any]:
    """JSON schema (draft 2020-12) of a stack file: keys, unit patterns, descriptions, examples.

    A schema sees one value at a time: names of materials, neighbours of wire ends and the like are
    checked by the reader alone.
    """
    return {"$schema": DIALECT, **_without_null(Document.model_json_schema(by_alias=True, mode="validation"))}


def _without_null(node: Any) -> Any:
    """The schema without null, which TOML does not have, and without titles that repeat the keys."""
    if isinstance(node, list):
        return [_without_null(item) for item in node if item != {"type": "null"}]
    if not isinstance(node, dict):
        return node
    kept = {key: value for key, value in node.items() if not (key == "default" and value is None)}
    if isinstance(kept.get("title"), str):
        del kept["title"]
    choices = _without_null(kept.pop("anyOf", []))
    kept = {key: _without_null(value) for key, value in kept.items()}
    return {**kept, **choices[0]} if len(choices) == 1 else {**kept, **({"anyOf": choices} if choices else {})}
