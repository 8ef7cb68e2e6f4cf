"""YAML 1.2 text to plain data, with the line and column of every value.

A small, closed subset: block and flow mappings, sequences and scalars. Anchors, aliases, tags, duplicate
keys and several documents are refused, as are files that are too large or nested too deeply, so that a
hostile file ends in bounded time. Scalars follow the core schema of YAML 1.2.2, 10.3.2: ``yes`` and ``on``
are text, ``0x10`` and ``1_000`` are text too (no sequence needs them), and there are no dates.
"""

from __future__ import annotations

import hashlib
import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, TypeAlias

import yaml

from benchrun.errors import InputError, Problem

__all__ = ["MAX_BYTES", "MAX_DEPTH", "Document", "Place", "load", "read_bytes"]

MAX_BYTES = 1_000_000
MAX_DEPTH = 40

Place: TypeAlias = tuple[int, int]
_FORBIDDEN = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\u2028\u2029\ufeff\ufffe\uffff]")
"""What YAML 1.2.2, 5.1, calls not printable, and line ends that editors and parsers count differently."""
_TAB_INDENT = re.compile(r"^ *\t", re.MULTILINE)  # a tab after content is only ugly
_INTEGER = re.compile(r"[-+]?[0-9]+")
_FLOAT = re.compile(r"[-+]?(\.[0-9]+|[0-9]+(\.[0-9]*)?)([eE][-+]?[0-9]+)?")
_WORDS: dict[str, Any] = {
    "": None,
    "~": None,
    "null": None,
    "Null": None,
    "NULL": None,
    "true": True,
    "True": True,
    "TRUE": True,
    "false": False,
    "False": False,
    "FALSE": False,
}


@dataclass(frozen=True, slots=True)
class Document:
    """One file, read.

    Parameters
    ----------
    data
        Plain dictionaries, lists and scalars.
    places
        One-based line and column by path: of the value, and of the key under ``(*path, KEY)``.
    name
        The file as the user named it.
    raw
        The bytes as read.
    """

    data: Any
    places: dict[tuple[object, ...], Place]
    name: str
    raw: bytes = field(repr=False)

    @property
    def sha256(self) -> str:
        """Digest of the bytes."""
        return hashlib.sha256(self.raw).hexdigest()

    def place(self, path: tuple[object, ...], key: bool = False) -> Place:
        """Line and column of a path, or of the nearest enclosing thing that has one."""
        if key and (path, "key") in self.places:
            return self.places[path, "key"]
        while path and path not in self.places:
            path = path[:-1]
        return self.places.get(path, (1, 1))

    def problem(
        self,
        message: str,
        path: tuple[object, ...] = (),
        advice: str = "",
        *,
        key: bool = False,
        severity: str = "error",
    ) -> Problem:
        """Make a problem with its place."""
        line, column = self.place(path, key)
        return Problem(message, self.name, line, column, advice, severity)


def read_bytes(path: Path, limit: int = MAX_BYTES) -> bytes:
    """Read a file of bounded size.

    Raises
    ------
    InputError
        If it cannot be read or is larger than ``limit``.
    """
    try:
        with path.open("rb") as file:
            data = file.read(limit + 1)
    except OSError as error:
        raise InputError(Problem(f"cannot be read: {error.strerror or error}", str(path))) from error
    if len(data) > limit:
        size = path.stat().st_size
        raise InputError(
            Problem(
                f"is {size:,} bytes long, at most {limit:,} are allowed",
                str(path),
                advice="Is this the right file?",
            )
        )
    return data


def load(raw: bytes, name: str) -> Document:
    """Parse bytes.

    Raises
    ------
    InputError
        With line and column of the first thing that is not allowed.
    """
    if len(raw) > MAX_BYTES:
        raise InputError(Problem(f"is {len(raw):,} bytes long, at most {MAX_BYTES:,} are allowed", name))
    text = _text(raw, name)
    try:
        data, places = _Builder(name).build(
            yaml.parse(text, Loader=getattr(yaml, "CSafeLoader", yaml.SafeLoader))
        )
    except yaml.MarkedYAMLError as error:
        mark = error.problem_mark or error.context_mark
        line, column = (mark.line + 1, mark.column + 1) if mark else (1, 1)
        said = " ".join(part for part in (error.context, error.problem) if part)
        raise InputError(Problem(f"is not YAML here: {said}", name, line, column)) from None
    except yaml.YAMLError as error:
        raise InputError(Problem(f"is not YAML: {error}", name, 1, 1)) from None
    if data is None:
        raise InputError(
            Problem("is empty", name, 1, 1, "A file begins with its kind, such as `sequence: NAME`.")
        )
    return Document(data, places, name, raw)


def _text(raw: bytes, name: str) -> str:
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        before = raw[: error.start]
        line, column = before.count(b"\n") + 1, error.start - before.rfind(b"\n")
        raise InputError(
            Problem(
                f"is not UTF-8 text (byte 0x{raw[error.start]:02X})", name, line, column, "Save it as UTF-8."
            )
        ) from None
    found = [m for m in (_FORBIDDEN.search(text), _TAB_INDENT.search(text)) if m]
    if found:
        first = min(found, key=lambda m: m.end())
        at = first.end() - 1
        line, column = text.count("\n", 0, at) + 1, at - text.rfind("\n", 0, at)
        tab = text[at] == "\t"
        what = "a tab in the indentation" if tab else _control(text[at])
        raise InputError(
            Problem(f"has {what}", name, line, column, "Indent with spaces." if tab else "Remove it.")
        )
    return text


class _Builder:
    """Builds data from parser events without recursion, so that depth is bounded by a count."""

    def __init__(self, name: str) -> None:
        self.name = name
        self.places: dict[tuple[object, ...], Place] = {}

    def fail(self, message: str, event: yaml.Event, advice: str = "") -> InputError:
        return InputError(Problem(message, self.name, *_place(event), advice))

    def build(self, events: Iterator[yaml.Event]) -> tuple[Any, dict[tuple[object, ...], Place]]:
        root: list[Any] = []
        stack: list[Any] = [root]  # containers being filled
        paths: list[tuple[object, ...]] = [()]  # path of each container; the root list stands outside
        keys: list[Any] = [_NO_KEY]  # pending key of each container
        documents = 0
        for event in events:
            if isinstance(event, yaml.DocumentStartEvent):
                documents += 1
                if documents > 1:
                    raise self.fail("holds a second document", event, "Keep one document a file.")
            if isinstance(event, yaml.AliasEvent) or getattr(event, "anchor", None):
                raise self.fail("uses an anchor or alias", event, "Write the value out where it is needed.")
            if isinstance(event, yaml.ScalarEvent | yaml.CollectionStartEvent) and _tagged(event):
                raise self.fail(f"uses the tag {event.tag}", event, "Tags are not used here.")
            if isinstance(event, yaml.ScalarEvent):
                if event.style and (hidden := _FORBIDDEN.search(event.value)):
                    raise self.fail(f"hides {_control(hidden[0])} in an escape", event, "Remove it.")
                value: Any = _scalar(event)
                self._put(stack, paths, keys, value, event)
            elif isinstance(event, yaml.CollectionStartEvent):
                if len(stack) > MAX_DEPTH:
                    raise self.fail(f"is nested more than {MAX_DEPTH} deep", event)
                value = {} if isinstance(event, yaml.MappingStartEvent) else []
                path = self._put(stack, paths, keys, value, event)
                stack.append(value)
                paths.append(path)
                keys.append(_NO_KEY)
            elif isinstance(event, yaml.CollectionEndEvent):
                stack.pop()
                paths.pop()
                keys.pop()
        return (root[0] if root else None), self.places

    def _put(
        self,
        stack: list[Any],
        paths: list[tuple[object, ...]],
        keys: list[Any],
        value: Any,
        event: yaml.Event,
    ) -> tuple[object, ...]:
        place = _place(event)
        container, path = stack[-1], paths[-1]
        if isinstance(container, list):
            path = path if len(stack) == 1 else (*path, len(container))
            container.append(value)
            self.places[path] = place
            return path
        if keys[-1] is _NO_KEY:
            if not isinstance(value, str | int) or isinstance(value, bool):
                raise self.fail(f"uses {value!r} as a key", event, "Keys are words or port numbers.")
            if value in container:
                line, column = self.places[(*path, value), "key"]
                raise self.fail(
                    f"says {value!r} twice; the first is at {line}:{column}", event, "Keep one of them."
                )
            keys[-1] = value
            container[value] = None
            self.places[(*path, value), "key"] = place
            return path
        path = (*path, keys[-1])
        container[keys[-1]] = value
        keys[-1] = _NO_KEY
        self.places[path] = place
        return path


_NO_KEY = object()


def _place(event: yaml.Event) -> Place:
    mark = event.start_mark
    return (mark.line + 1, mark.column + 1) if mark else (1, 1)


def _control(character: str) -> str:
    return f"the control character 0x{ord(character):02X}"


def _tagged(event: yaml.ScalarEvent | yaml.CollectionStartEvent) -> bool:
    return event.tag is not None


def _scalar(event: yaml.ScalarEvent) -> Any:
    text = event.value
    if event.style:  # quoted or block: always text
        return text
    if text in _WORDS:
        return _WORDS[text]
    if len(text) <= 30 and _INTEGER.fullmatch(text):
        return int(text)
    if len(text) <= 60 and _FLOAT.fullmatch(text):
        return float(text)
    return text
