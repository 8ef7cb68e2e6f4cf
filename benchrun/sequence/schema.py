"""The JSON Schema of each kind of file, so that an editor completes it."""

from __future__ import annotations

import copy
import functools
from typing import Any

from pydantic import BaseModel

__all__ = ["keys_at", "schema"]


def schema(model: type[BaseModel]) -> dict[str, Any]:
    """JSON Schema, draft 2020-12, with the keys as files write them."""
    return copy.deepcopy(_made(model))


@functools.cache
def _made(model: type[BaseModel]) -> dict[str, Any]:
    made = model.model_json_schema(by_alias=True, mode="validation")
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", **made}


def keys_at(model: type[BaseModel], data: Any, path: tuple[object, ...]) -> list[str]:
    """Keys that may stand in the mapping at ``path``.

    Parameters
    ----------
    model
        Kind of file.
    data
        What the file says; decides between alternatives.
    path
        Keys and indices down to the mapping.
    """
    whole = _made(model)
    node = whole
    for part in path:
        node = _into(whole, node, part)
        data = _down(data, part)
    return sorted({key for option in _options(whole, node, data) for key in option.get("properties", {})})


def _down(data: Any, part: Any) -> Any:
    try:
        return data[part]
    except (KeyError, IndexError, TypeError):
        return None


def _resolve(whole: dict[str, Any], node: dict[str, Any]) -> dict[str, Any]:
    while "$ref" in node:
        node = whole["$defs"][node["$ref"].rsplit("/", 1)[1]]
    return node


def _options(whole: dict[str, Any], node: dict[str, Any], data: Any) -> list[dict[str, Any]]:
    node = _resolve(whole, node)
    found = []
    for option in node.get("anyOf") or node.get("oneOf") or [node]:
        option = _resolve(whole, option)
        required = set(option.get("required", ()))
        if "properties" in option and (not isinstance(data, dict) or not required or required & set(data)):
            found.append(option)
    return found or [node]


def _into(whole: dict[str, Any], node: dict[str, Any], part: object) -> dict[str, Any]:
    node = _resolve(whole, node)
    for option in node.get("anyOf") or node.get("oneOf") or [node]:
        option = _resolve(whole, option)
        if isinstance(part, int) and "items" in option:
            return dict(option["items"])
        if part in option.get("properties", {}):
            return dict(option["properties"][part])
        for inner in (option.get("additionalProperties"), *option.get("patternProperties", {}).values()):
            if isinstance(inner, dict):
                return dict(inner)
    return {}
