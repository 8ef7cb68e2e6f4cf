"""Faults of the unit under test, in the words of bench files, with what a careful engineer would see."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

__all__ = ["PART", "PART_FAULTS", "PartFault", "part_fault"]

PART = "part:"
"""Begins the name of such a fault: ``"part: L2 +15 %"``."""


@dataclass(frozen=True)
class PartFault:
    """A fault of a part.

    Parameters
    ----------
    words
        An example of how it is written.
    pattern
        Of all ways to write it.
    kinds
        Parts that can have it; none: every one.
    seen
        What a careful engineer would see.
    """

    words: str
    pattern: str
    kinds: tuple[str, ...]
    seen: str


_LADDERS = ("ladder", "filter", "coupled resonators", "matching", "pad", "antenna")

PART_FAULTS: Sequence[PartFault] = (
    PartFault("L2 +15 %", r"\w+ [+-][\d.]+ ?%", _LADDERS,
        "Corner or centre frequency moves and return loss in the band gets worse, smoothly: a value out of "
        "tolerance."),
    PartFault("C3 = 39 pF", r"\w+ = .+", _LADDERS,
        "As for a value out of tolerance, but by a step of the value series: the wrong one was fitted, and "
        "others of the same reel will be the same."),
    PartFault("open joint at C1", r"open joint at \w+", _LADDERS,
        "A shunt element is missing: a zero or a slope less. A series element: hardly anything comes "
        "through, and what does rises with frequency. It may come back when pressed or warmed."),
    PartFault("solder bridge across L2", r"solder bridge across \w+", _LADDERS,
        "A series element is missing; a shunt one shorts the line, and the unit reflects everything."),
    PartFault("connector loose", r"connector( [12])? loose", (),
        "Some tenths of a decibel are lost at all frequencies, return loss on that side gets worse with "
        "frequency, and readings do not repeat when the connector is touched."),
    PartFault("water in the cable", r"water in the cable", ("cable",),
        "Loss grows in proportion to frequency, the cable is longer electrically and below 50 ohm."),
    PartFault("crushed at 40 %", r"crushed at [\d.]+ ?%", ("cable",),
        "Return loss gets worse with ripples whose spacing tells how far along; loss hardly changes."),
    PartFault("hand nearby", r"hand nearby", ("antenna",),
        "Resonance falls by some percent and becomes broader; it moves with whoever stands there."),
    PartFault("cut -3 %", r"cut [+-]?[\d.]+ ?%", ("antenna",),
        "The whip is too long or too short: resonance has moved, its depth has hardly changed."),
    PartFault("gain -3 dB", r"gain [+-][\d.]+ dB", ("amplifier",),
        "Gain is low at all frequencies and levels; the supply current may be as usual."),
    PartFault("P1dB -4 dB", r"P1dB [+-][\d.]+ dB", ("amplifier",),
        "Gain is right at low level and falls too early; only a test with drive shows it."),
    PartFault("noise figure +3 dB", r"noise figure [+-][\d.]+ dB", ("amplifier",),
        "Gain and match are right, and the floor behind the stage stands higher."),
)  # fmt: skip
"""Those of named elements are tried last."""


def part_fault(words: str) -> PartFault | None:
    """The fault that words mean; None: none.

    Examples
    --------
    >>> part_fault("C4 -10 %").words
    'L2 +15 %'
    """
    by_name_last = sorted(PART_FAULTS, key=lambda fault: fault.pattern.startswith(r"\w"))
    return next((fault for fault in by_name_last if re.fullmatch(fault.pattern, words.strip())), None)
