"""Files to models, with every problem at its line and column."""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Generic, TypeVar

from pydantic import BaseModel, ValidationError
from pydantic_core import ErrorDetails

from benchrun.errors import InputError, Problem
from benchrun.sequence.bench import Bench
from benchrun.sequence.kit import KitFile
from benchrun.sequence.loading import Document, load, read_bytes
from benchrun.sequence.mask import MaskFile
from benchrun.sequence.models import Sequence
from benchrun.sequence.steps import STEP_KINDS

__all__ = ["KINDS", "Loaded", "kind_of", "load_model", "read", "validate"]

M = TypeVar("M", bound=BaseModel)

KINDS: dict[str, type[BaseModel]] = {"sequence": Sequence, "bench": Bench, "kit": KitFile, "mask": MaskFile}
"""Kind of file by its first key."""


@dataclass(frozen=True, slots=True)
class Loaded(Generic[M]):
    """A model with the file it came from.

    Parameters
    ----------
    model
        The validated model.
    document
        Bytes, plain data and places.
    path
        Where it was read.
    """

    model: M
    document: Document
    path: Path

    @property
    def folder(self) -> Path:
        """Names in the file are looked up beside it."""
        return self.path.parent


def read(path: Path, model: type[M]) -> Loaded[M]:
    """Read and validate one file.

    Raises
    ------
    InputError
        With all problems found.
    """
    return load_model(read_bytes(path), str(path), model, path)


def load_model(raw: bytes, name: str, model: type[M], path: Path | None = None) -> Loaded[M]:
    """Validate bytes, for example a copy kept in a record.

    Raises
    ------
    InputError
        With all problems found.
    """
    document = load(raw, name)
    return Loaded(validate(document, model), document, path or Path(name))


def kind_of(document: Document) -> str:
    """Which kind of file this is.

    Raises
    ------
    InputError
        If its first key is none of :data:`KINDS`.
    """
    if isinstance(document.data, dict):
        for kind in KINDS:
            if kind in document.data:
                return kind
    raise InputError(
        document.problem(
            f"is no {', '.join(KINDS)} file", (), f"It must begin with one of the keys {', '.join(KINDS)}."
        )
    )


def validate(document: Document, model: type[M]) -> M:
    """Plain data to a model.

    Raises
    ------
    InputError
        With all problems found.
    """
    if not isinstance(document.data, dict):
        raise InputError(document.problem(f"is a {type(document.data).__name__}, not keys with values"))
    try:
        return model.model_validate(document.data)
    except ValidationError as error:
        raise InputError(_problems(document, error)) from None


def _problems(document: Document, error: ValidationError) -> Iterator[Problem]:
    seen = set()
    for detail in error.errors(include_url=False):
        path = _path(document, detail["loc"])
        problem = _problem(document, detail, path)
        if problem not in seen:
            seen.add(problem)
            yield problem


def _path(document: Document, loc: tuple[int | str, ...]) -> tuple[object, ...]:
    """The part of pydantic's location that exists in the file; union labels are dropped."""
    path: tuple[object, ...] = ()
    for part in loc:
        if (*path, part) in document.places or ((*path, part), "key") in document.places:
            path = (*path, part)
    return path


def _problem(document: Document, detail: ErrorDetails, path: tuple[object, ...]) -> Problem:
    kind, value, context = detail["type"], detail["input"], detail.get("ctx") or {}
    key = detail["loc"][-1] if detail["loc"] else ""
    if kind == "extra_forbidden":
        return _extra(document, path, str(key))
    if kind == "missing":
        return document.problem(f"lacks the key {key!r}", path, "Add it.")
    if kind == "benchrun":
        inner = (*path, context["key"])
        return document.problem(str(context["message"]), inner if inner in document.places else path)
    if kind in ("union_tag_invalid", "union_tag_not_found"):
        return _no_step(document, path, context)
    if kind == "value_error":
        return document.problem(str(context["error"]), path)
    if kind == "literal_error" and isinstance(value, str):
        close = difflib.get_close_matches(
            value, re.findall(r"'([^']+)'", str(context.get("expected"))), 1, 0.5
        )
        if close:
            return document.problem(f"{key}: {value!r} is not known", path, f"Did you mean {close[0]!r}?")
    said = detail["msg"]
    said = said[0].lower() + said[1:]
    return document.problem(
        f"{path[-1] if path else key!s}: {_short(value)} is not allowed here: {said}", path
    )


def _extra(document: Document, path: tuple[object, ...], key: str) -> Problem:
    siblings = document.data
    for part in path[:-1]:
        siblings = siblings[part]
    known = _keys_near(document, path[:-1])
    close = difflib.get_close_matches(key, [k for k in known if k not in siblings], 1, 0.5)
    advice = f"Did you mean {close[0]!r}?" if close else (f"Known here: {', '.join(known)}." if known else "")
    return document.problem(f"the key {key!r} means nothing here", path, advice, key=True)


def _keys_near(document: Document, path: tuple[object, ...]) -> list[str]:
    """Keys that a schema allows at a path, found by walking the exported schema."""
    from benchrun.sequence.schema import keys_at

    return keys_at(KINDS[kind_of(document)], document.data, path)


def _no_step(document: Document, path: tuple[object, ...], context: dict[str, Any]) -> Problem:
    tag = str(context.get("tag", ""))
    close = difflib.get_close_matches(tag, STEP_KINDS, 1, 0.5)
    advice = f"Did you mean {close[0]!r}?" if close else f"Known steps: {', '.join(STEP_KINDS)}."
    if " " in tag:
        return document.problem(tag, path, f"Known steps: {', '.join(STEP_KINDS)}.")
    return document.problem(f"there is no step {tag!r}", (*path, tag), advice, key=True)


def _short(value: object) -> str:
    text = repr(value)
    return text if len(text) <= 60 else text[:57] + "..."
