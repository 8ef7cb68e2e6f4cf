"""Raw readings of every kind, and the file each is kept as."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np

from benchrun.errors import CouldNotCheck
from benchrun.rf.touchstone import read as read_touchstone
from benchrun.rf.touchstone import write as write_touchstone
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["Levels", "Raw", "decode", "encode", "suffix", "two_ports"]


@dataclass(frozen=True, slots=True, eq=False)
class Levels:
    """Levels read at one connection.

    Parameters
    ----------
    source_dbm
        What the generator was set to, ``(k,)``.
    read_dbm
        What was read at each frequency, ``(k, h)``.
    supply_a
        Supply current at each level, ``(k,)``; nan without a supply.
    """

    source_dbm: FloatArray
    read_dbm: FloatArray
    supply_a: FloatArray


Raw: TypeAlias = TwoPort | Levels
"""A raw reading: the 2x2 readings of a network analyzer, or levels."""


def two_ports(readings: Mapping[str, Raw]) -> dict[str, TwoPort]:
    """Those that are 2x2 readings."""
    return {name: raw for name, raw in readings.items() if isinstance(raw, TwoPort)}


def suffix(raw: Raw) -> str:
    """Ending of the file that keeps it."""
    return ".s2p" if isinstance(raw, TwoPort) else ".json"


def encode(f_hz: FloatArray, raw: Raw, comment: str) -> bytes:
    """Bytes of the file that keeps a reading; :func:`decode` gives the same numbers to the last bit.

    Parameters
    ----------
    f_hz
        Frequencies in Hz: ``(f,)`` of a sweep, ``(h,)`` of carrier and harmonics.
    raw
        The reading.
    comment
        What it is of.
    """
    if isinstance(raw, TwoPort):
        return write_touchstone(f_hz, raw, comment)
    table = {
        "reading": comment,
        "frequencies_hz": f_hz.tolist(),
        "source_dbm": raw.source_dbm.tolist(),
        "read_dbm": raw.read_dbm.tolist(),
        "supply_a": [None if np.isnan(a) else a for a in raw.supply_a.tolist()],
    }
    return (json.dumps(table, indent=1) + "\n").encode()


def decode(contents: bytes, name: str) -> Raw:
    """A kept reading.

    Raises
    ------
    InputError, CouldNotCheck
        If the file is not what it should be.
    """
    if not name.endswith(".json"):
        return read_touchstone(contents, name).two_port
    try:
        table = json.loads(contents)
        levels = Levels(
            np.array(table["source_dbm"], np.float64),
            np.array(table["read_dbm"], np.float64),
            np.array([np.nan if a is None else a for a in table["supply_a"]], np.float64),
        )
    except (ValueError, KeyError, TypeError) as error:
        raise CouldNotCheck(f"{name} is no table of levels: {error}") from error
    if levels.read_dbm.ndim != 2 or len(levels.read_dbm) != len(levels.source_dbm):
        raise CouldNotCheck(f"{name} is no table of levels: its rows do not fit its source levels")
    return levels
