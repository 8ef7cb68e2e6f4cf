"""The audit of a record: it is the one that was signed, and its result follows from its readings.

How a result is computed anew is handed in, so that this file only compares.
"""

from __future__ import annotations

import json
import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, fields
from pathlib import Path
from typing import TypeAlias

from benchrun.errors import BenchError, CouldNotCheck, RecordError, SignatureWrong
from benchrun.evaluate.judgement import JudgedFigure
from benchrun.record.envelope import FILE_NAME
from benchrun.record.keys import KeyStore
from benchrun.record.payload import Payload
from benchrun.record.verify import Record, Verified, verify

__all__ = ["RELATIVE", "Audit", "Recompute", "Recomputed", "ResultWrong", "audit", "compare"]

RELATIVE = 1e-9
"""Greatest relative difference between a recorded figure and the recomputed one."""

_TINY = {"s": 1e-21}
"""Differences that count as none, in the figure's unit; 1e-12 for all other units."""


class ResultWrong(RecordError):
    """The recorded result does not follow from the recorded readings.

    Parameters
    ----------
    folder
        The record.
    differences
        One sentence for each.
    """

    def __init__(self, folder: Path, differences: tuple[str, ...]) -> None:
        super().__init__(folder, differences)
        self.folder = folder
        self.differences = differences

    def __str__(self) -> str:
        return f"{self.folder}: the result does not follow from the readings:\n" + "\n".join(self.differences)


@dataclass(frozen=True, slots=True)
class Recomputed:
    """A result computed anew from the raw readings of a record.

    Parameters
    ----------
    conclusion
        The run's.
    figures
        All judged figures, in the order of the sequence.
    results
        File in the record to the bytes that should stand in it.
    """

    conclusion: str
    figures: tuple[JudgedFigure, ...]
    results: Mapping[str, bytes] = field(default_factory=dict)


Recompute: TypeAlias = Callable[[Record], Recomputed]
"""Computes a record's result anew."""


@dataclass(frozen=True, slots=True)
class Audit:
    """A record that stood the audit.

    Parameters
    ----------
    record
        The record.
    findings
        What was checked, a sentence each.
    """

    record: Record
    findings: tuple[str, ...]


def audit(folder: Path, store: KeyStore, recompute: Recompute) -> Audit:
    """Check a record and recompute its result.

    Parameters
    ----------
    folder
        The record's folder.
    store
        Whose keys are trusted.
    recompute
        Computes the result anew.

    Returns
    -------
    Audit
        What was found, all of it good.

    Raises
    ------
    SignatureWrong, DigestWrong
        As :func:`benchrun.record.verify.verify`; also if securesystemslib is of another opinion.
    ResultWrong
        If a figure, the conclusion or a result file comes out differently.
    CouldNotCheck
        If no verdict was possible.
    """
    verified = verify(folder, store)
    record = verified.record
    _second_opinion(verified)
    try:
        again = recompute(record)
    except RecordError:
        raise
    except Exception as error:  # whatever it is, it is no verdict, and must not stop the audit of others
        said = str(error) if isinstance(error, BenchError) else f"{type(error).__name__}: {error}"
        raise CouldNotCheck(f"{folder}: the result could not be recomputed: {said}") from error
    if differences := compare(record, again):
        raise ResultWrong(folder, differences)
    return Audit(record, _findings(verified, again))


def compare(record: Record, again: Recomputed) -> tuple[str, ...]:
    """All differences between a record and its recomputed result, a sentence each.

    Parameters
    ----------
    record
        The record.
    again
        The result computed anew.
    """
    payload: Payload = record.payload
    found = [] if payload.conclusion == again.conclusion else [_differs("conclusion", payload, again)]
    if len(payload.figures) != len(again.figures):
        found.append(f"figures: recorded {len(payload.figures)}, recomputed {len(again.figures)}")
    for recorded, new in zip(payload.figures, again.figures, strict=False):
        found.extend(_figure_differences(recorded, new))
    recorded_files = {one.file for one in payload.results}
    for file in sorted(recorded_files ^ set(again.results)):
        found.append(f"{file}: {'recorded' if file in recorded_files else 'recomputed'} only")
    for file in sorted(recorded_files & set(again.results)):
        if (old := record.content(file)) != again.results[file]:
            found.append(_file_difference(file, old, again.results[file]))
    return tuple(found)


def _differs(name: str, recorded: object, new: object) -> str:
    return f"{name}: recorded {getattr(recorded, name)!r}, recomputed {getattr(new, name)!r}"


def _figure_differences(recorded: JudgedFigure, new: JudgedFigure) -> list[str]:
    scale = max(abs(one) for one in (recorded.value or 0.0, recorded.limit, new.value or 0.0))
    found = []
    for one in fields(JudgedFigure):
        old, now = getattr(recorded, one.name), getattr(new, one.name)
        if not _same(one.name, old, now, recorded.unit, scale):
            found.append(f"{recorded.name}: {one.name}: recorded {old!r}, recomputed {now!r}")
    return found


def _same(name: str, old: object, now: object, unit: str, scale: float) -> bool:
    if not isinstance(old, float) or not isinstance(now, float):
        return old == now
    if name == "risk":
        # A tail probability magnifies relative differences of its argument.
        return math.isclose(old, now, rel_tol=RELATIVE, abs_tol=RELATIVE)
    tiny = _TINY.get(unit, 1e-12)
    # A margin is a difference: it can be no more exact than what it was taken from.
    slack = RELATIVE * scale if name == "margin" else 0.0
    return math.isclose(old, now, rel_tol=RELATIVE, abs_tol=max(tiny, slack))


def _file_difference(file: str, old: bytes, new: bytes) -> str:
    old_lines, new_lines = old.splitlines(), new.splitlines()
    for number, (was, now) in enumerate(zip(old_lines, new_lines, strict=False), start=1):
        if was != now:
            shown = [line[:80].decode(errors="replace") for line in (was, now)]
            return f"{file}:{number}: recorded {shown[0]!r}, recomputed {shown[1]!r}"
    return f"{file}: recorded {len(old)} bytes, recomputed {len(new)} bytes"


def _second_opinion(verified: Verified) -> None:
    """Let securesystemslib check the same envelope: another implementation of DSSE."""
    from securesystemslib.dsse import Envelope
    from securesystemslib.exceptions import VerificationError
    from securesystemslib.signer import Key, SSlibKey  # type: ignore[attr-defined]

    record = verified.record
    keys: list[Key] = [
        SSlibKey(key.key_id, "ed25519", "ed25519", {"public": key.public_key.raw.hex()})
        for key in verified.keys
    ]
    try:
        Envelope.from_dict(json.loads(record.envelope.to_json())).verify(keys, len(keys))
    except VerificationError as error:
        raise SignatureWrong(
            f"{record.folder / FILE_NAME}: securesystemslib does not accept it: {error}"
        ) from error


def _findings(verified: Verified, again: Recomputed) -> tuple[str, ...]:
    record = verified.record
    lines = [f"signed by {key.label} ({key.purpose} key {key.key_id[:16]})" for key in verified.keys]
    lines.append("securesystemslib accepts the envelope too")
    lines.append(f"{len(record.files)} files are the ones that were signed")
    lines.append(f"origin: {record.payload.origin}")
    lines.append(
        f"recomputed from the raw readings: conclusion {again.conclusion}, {len(again.figures)} figures, "
        f"{len(again.results)} result files, all as recorded"
    )
    lines.extend(
        f"{one.step}: at the time of the run scikit-rf agreed within {one.difference:.1e}"
        for one in record.payload.agreements
    )
    return tuple(lines)
