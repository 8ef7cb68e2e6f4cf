"""A record before it is signed and written."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

from benchrun.record.payload import Payload

__all__ = ["Draft"]


@dataclass
class Draft:
    """Payload and files of a record, in memory.

    Parameters
    ----------
    payload
        What is said about the run.
    files
        POSIX relative path to content; every file that the payload names must be there.
    twins
        For some files a place where the same bytes stand already, in an earlier record: units under one
        calibration share its readings on the medium.
    """

    payload: Payload
    files: dict[str, bytes] = field(default_factory=dict)
    twins: dict[str, Path] = field(default_factory=dict)
