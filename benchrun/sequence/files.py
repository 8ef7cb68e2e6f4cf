"""Files to models, with every problem at its line and column."""

from __future__ import annotations

import difflib
import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Generic, TypeVar

from pydantic import BaseModel, ValidationError
from pydantic_core import ErrorDetails

from benchrun.errors import InputError, Problem
from benchrun.sequence.bench import Bench
from benchrun.sequence.fields import LABEL
from benchrun.sequence.kit import KitFile
from benchrun.sequence.loading import Document, load, read_bytes
from benchrun.sequence.mask import MaskFile
from benchrun.sequence.models import Sequence
from benchrun.sequence.steps import STEP_KINDS

__all__ = ["KINDS", "Loaded", "kind_of", "load_model", "read", "validate"]

M = TypeVar("M", bound=BaseModel)

KINDS: dict[str, type[BaseModel]] = {"sequence": Sequence, "bench": Bench, "kit": KitFile, "mask": MaskFile}
"""Kind of file by its first key."""
_MOST_PROBLEMS = 50


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
    keys = [key for key in document.data if isinstance(key, str)] if isinstance(document.data, dict) else []
    for key in keys[:20]:
        close = difflib.get_close_matches(key, KINDS, 1, 0.6)
        if close:
            raise InputError(document.problem(f"the key {_short(key)} names no kind of file", (key,),
                                              f"Did you mean {close[0]!r}?", key=True))  # fmt: skip
    raise InputError(
        document.problem(
            f"is no {', '.join(KINDS)} file", (), f"It must have one of the keys {', '.join(KINDS)}."
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
        raise InputError(_problems(document, model, error)) from None


def _problems(document: Document, model: type[BaseModel], error: ValidationError) -> list[Problem]:
    found: dict[Problem, None] = {}
    details = error.errors(include_url=False, include_input=True)
    for detail in details[:_MOST_PROBLEMS]:
        if detail["type"] == "too_short" and _explained(detail, details):
            continue
        found[_problem(document, model, detail)] = None
    if len(details) > _MOST_PROBLEMS:
        found[
            document.problem(f"has {len(details) - _MOST_PROBLEMS} more problems", advice="Mend these first.")
        ] = None
    return sorted(found, key=lambda problem: (problem.line, problem.column))


def _explained(detail: ErrorDetails, details: list[ErrorDetails]) -> bool:
    """Tell whether a list is too short only because items of it were refused, which is said already."""
    depth = len(detail["loc"])
    return any(len(d["loc"]) > depth and d["loc"][:depth] == detail["loc"] for d in details)


def _path(document: Document, loc: tuple[int | str, ...]) -> tuple[object, ...]:
    """Take the part of pydantic's location that exists in the file; union labels are dropped."""
    path: tuple[object, ...] = ()
    for part in loc:
        if isinstance(part, str) and part.startswith(LABEL):
            continue
        if (*path, part) in document.places or ((*path, part), "key") in document.places:
            path = (*path, part)
    return path


def _problem(document: Document, model: type[BaseModel], detail: ErrorDetails) -> Problem:
    path = _path(document, detail["loc"])
    kind, value, context = detail["type"], detail["input"], detail.get("ctx") or {}
    key = detail["loc"][-1] if detail["loc"] else ""
    if kind == "extra_forbidden":
        return _extra(document, model, path, key)
    if kind == "missing":
        return document.problem(f"lacks the key {key!r}", path, "Add it.")
    if kind == "benchrun":
        inner = (*path, context["key"])
        return document.problem(_clip(str(context["message"])), inner if inner in document.places else path)
    if kind in ("union_tag_invalid", "union_tag_not_found"):
        return _no_step(document, path, context)
    if kind == "value_error":
        return document.problem(_clip(str(context["error"])), path)
    if key == "[key]":
        return _bad_key(document, path, value, context)
    if kind == "literal_error" and isinstance(value, str):
        allowed = re.findall(r"'([^']+)'", str(context.get("expected")))
        alike = [word for word in allowed if word.lower() == value.lower()]
        close = alike or difflib.get_close_matches(value, allowed, 1, 0.5)
        if close:
            return document.problem(
                f"{key}: {_short(value)} is not known", path, f"Did you mean {close[0]!r}?"
            )
    said = detail["msg"]
    said = said[0].lower() + said[1:]
    return document.problem(
        f"{path[-1] if path else key!s}: {_short(value)} is not allowed here: {said}", path
    )


def _extra(document: Document, model: type[BaseModel], path: tuple[object, ...], key: object) -> Problem:
    from benchrun.sequence.schema import keys_at

    siblings = document.data
    for part in path[:-1]:
        siblings = siblings[part]
    known = keys_at(model, document.data, path[:-1])
    close = difflib.get_close_matches(str(key), [k for k in known if k not in siblings], 1, 0.5)
    advice = f"Did you mean {close[0]!r}?" if close else (f"Known here: {', '.join(known)}." if known else "")
    return document.problem(f"the key {_short(key)} means nothing here", path, advice, key=True)


def _bad_key(document: Document, path: tuple[object, ...], value: object, context: dict[str, Any]) -> Problem:
    known = re.findall(r"'([^']+)'", str(context.get("expected", "")))
    close = difflib.get_close_matches(str(value), known, 1, 0.5)
    advice = f"Did you mean {close[0]!r}?" if close else ""
    allowed = context.get("expected") or f"text like {context.get('pattern', 'a name')}"
    return document.problem(
        f"the key {_short(value)} is not allowed here; write {allowed}", path, advice, key=True
    )


def _no_step(document: Document, path: tuple[object, ...], context: dict[str, Any]) -> Problem:
    known = f"Known steps: {', '.join(STEP_KINDS)}."
    if "tag" not in context:
        return document.problem("a step is one key, its kind, with its settings below", path, known)
    tag = str(context["tag"]).removeprefix(LABEL)
    close = difflib.get_close_matches(tag, STEP_KINDS, 1, 0.5)
    advice = f"Did you mean {close[0]!r}?" if close else known
    return document.problem(f"there is no step {_short(tag)}", (*path, tag), advice, key=True)


def _clip(text: str) -> str:
    return text if len(text) <= 400 else text[:397] + "..."


def _short(value: object) -> str:
    text = repr(value)
    return text if len(text) <= 60 else text[:57] + "..."
