"""Parts by kind; this table is the only place that knows them all."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace
from typing import Any

from sim_instruments.draws import Draws
from sim_instruments.parts.amplifier import amplifier
from sim_instruments.parts.antenna import antenna
from sim_instruments.parts.base import Part, Surroundings
from sim_instruments.parts.cable import cable, transmission_line
from sim_instruments.parts.design import coupled_resonators, filter_, matching
from sim_instruments.parts.fixture import fixture
from sim_instruments.parts.ladder import ladder
from sim_instruments.parts.measured import measured
from sim_instruments.parts.pad import pad
from sim_instruments.parts.spoiled import is_general, spoiled
from sim_instruments.parts.standards import standard

__all__ = ["KINDS", "Part", "Surroundings", "build"]

KINDS: Mapping[str, Callable[[Mapping[str, Any], Draws], Part]] = {
    "amplifier": amplifier,
    "antenna": antenna,
    "cable": cable,
    "coupled resonators": coupled_resonators,
    "filter": filter_,
    "fixture": fixture,
    "ladder": ladder,
    "line": transmission_line,
    "matching": matching,
    "measured": measured,
    "pad": pad,
    "standard": standard,
}


def build(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A part from its description.

    Parameters
    ----------
    spec
        With a key ``kind``, one of :data:`KINDS`, and perhaps ``faults``, in words: those of its kind, and
        ``"connector loose"`` of any.
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
    faults = [str(fault) for fault in spec.get("faults", ())]
    own = [fault for fault in faults if not is_general(fault)]
    part = KINDS[kind]({**spec, "faults": own} if faults else spec, draws)
    for fault in faults:
        if is_general(fault):
            part = spoiled(part, fault)
    return replace(part, kind=kind, says="; ".join(faults) or part.says)
