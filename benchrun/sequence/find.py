"""From a name, or a path, to a file: beside the file that refers to it, then ./sequences, then installed."""

from __future__ import annotations

import difflib
from collections.abc import Iterator
from pathlib import Path

from benchrun.errors import InputError, Problem
from benchrun.paths import installed_sequences

__all__ = ["FOLDERS", "find", "named"]

FOLDERS = {"sequence": "", "bench": "benches", "kit": "kits", "mask": "masks", "fixture": "fixtures",
           "standard": "kits"}  # fmt: skip
"""Subfolder of each kind within a folder of sequences."""

_TOUCHSTONE = ("fixture", "standard")
"""Kinds whose names keep their endings."""


def _places(kind: str, beside: Path | None) -> Iterator[Path]:
    roots = ([beside] if beside else []) + [Path("sequences"), installed_sequences()]
    for root in roots:
        if root == beside:
            yield root
        yield root / FOLDERS[kind]


def find(kind: str, name: str, beside: Path | None = None, place: Problem | None = None) -> Path:
    """Find the file that a name means.

    Parameters
    ----------
    kind
        One of :data:`FOLDERS`.
    name
        A path, or a name without its ending.
    beside
        Folder of the file that uses the name; None for the command line.
    place
        Where the name was used, for the complaint.

    Raises
    ------
    InputError
        If there is none, with the nearest name that exists.
    """
    ending = "" if kind in _TOUCHSTONE else ".yaml"
    for folder in (beside, Path()) if beside else (Path(),):
        direct = folder / name
        if Path(name).suffix and _is_file(direct):
            return direct
    for folder in _places(kind, beside):
        candidate = folder / (name if name.endswith(ending) else name + ending)
        if _is_file(candidate):
            return candidate
    known = [n for n, _ in named(kind, beside)]
    close = difflib.get_close_matches(name, known, 1, 0.5)
    advice = f"Did you mean {close[0]!r}?" if close else f"Known by name: {', '.join(known) or 'none'}."
    at = place or Problem("")
    raise InputError(Problem(f"there is no {kind} {name!r}", at.file, at.line, at.column, advice))


def _is_file(path: Path) -> bool:
    try:
        return path.is_file()
    except OSError:  # for example a name that is too long to be one
        return False


def named(kind: str, beside: Path | None = None) -> list[tuple[str, Path]]:
    """All names of a kind, each with the file that it means; sorted."""
    found: dict[str, Path] = {}
    pattern = "*.s[12]p" if kind in _TOUCHSTONE else "*.yaml"
    for folder in _places(kind, beside):
        if folder.is_dir():
            for path in sorted(folder.glob(pattern)):
                found.setdefault(path.name if kind in _TOUCHSTONE else path.stem, path)
    return sorted(found.items())
