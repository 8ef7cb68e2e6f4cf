"""Parts by kind; this table is the only place that knows them all."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from sim_instruments.draws import Draws
from sim_instruments.parts.antenna import antenna
from sim_instruments.parts.base import Part, Surroundings
from sim_instruments.parts.fixture import fixture
from sim_instruments.parts.ladder import ladder
from sim_instruments.parts.measured import measured
from sim_instruments.parts.pad import pad
from sim_instruments.parts.standards import standard

__all__ = ["KINDS", "Part", "Surroundings", "build"]

KINDS: Mapping[str, Callable[[Mapping[str, Any], Draws], Part]] = {
    "antenna": antenna,
    "fixture": fixture,
    "ladder": ladder,
    "measured": measured,
    "pad": pad,
    "standard": standard,
}


def build(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A part from its description.

    Parameters
    ----------
    spec
        With a key ``kind``, one of :data:`KINDS`.
    draws
        Where its tolerances come from.

    Raises
    ------
    ValueError
        If the description makes no sense.
    """
    kind = str(spec.get("kind"))
    if kind not in KINDS:
        raise ValueError(f"there is no part of kind {kind!r}; known are {', '.join(KINDS)}")
    return KINDS[kind](spec, draws)
