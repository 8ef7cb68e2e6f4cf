"""Doubts about short, open and load of one port, held against each other and against the port at rest.

Most analyzers read both ports at every hook-up. So a port is also read while the other one is being served,
and then mostly nothing is on it: whatever was to hang there and reads the same was not there. Nobody promises
that a port at rest is bare, so such a reading decides only where the others make no sense either.
The rules are our own; where one rests on a formula, that is named at the rule.
"""

from __future__ import annotations

import functools
from collections.abc import Mapping
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from benchrun.rf.calibration.doubts import ALIKE, Suspicion, apart, size
from benchrun.rf.calibration.method import Definitions
from benchrun.rf.calibration.one_port import REFLECTIONS
from benchrun.rf.calibration.plausibility import (
    bends,
    box_cost,
    box_of,
    delay_s,
    exchanged,
    intercept_rad,
    middle,
    steadiness,
)
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["PortReadings", "doubt_port", "turned_at_rest"]

_SAME = 0.012
"""Share of a full reflection within which two readings are of the same thing, cables at rest."""

_LIKE_LOAD = 0.5
"""Below this share of a full reflection something reads like a load."""


@dataclass(frozen=True, eq=False)
class PortReadings:
    """What is known of one port.

    Parameters
    ----------
    port
        Its number.
    own
        Its own reading at each of its hook-ups, by standard, in the order of making, ``(f,)``.
    across
        What the other port read meanwhile; empty where it was not read.
    rest
        Its own readings while the other port was served; empty likewise.
    other
        The other port's own readings at its hook-ups, by standard.
    """

    port: int
    own: Mapping[str, ComplexArray]
    across: Mapping[str, ComplexArray]
    rest: tuple[ComplexArray, ...]
    other: Mapping[str, ComplexArray]

    def text(self, name: str) -> str:
        """Hook-up of a standard."""
        return f"{name} on port {self.port}"

    @functools.cached_property
    def level(self) -> Mapping[str, float]:
        """Level of each own reading, linear."""
        return {name: size(plane) for name, plane in self.own.items()}

    @functools.cached_property
    def full(self) -> float:
        """Level of a full reflection, as far as anything read like one, linear."""
        return max((*self.level.values(), *(size(p) for p in self.rest)), default=0.0)


def doubt_port(at: PortReadings, definitions: Definitions, f_hz: FloatArray) -> list[Suspicion]:
    """All doubts about one port's hook-ups; empty if they look well."""
    truths = {n: np.asarray(definitions[n]) for n in at.own if n in definitions}
    strong = [n for n in truths if size(truths[n]) > 0.5]
    found = [
        Suspicion(at.text(n), "It reads like noise: nothing reaches the receiver.", 0.95, "noise")
        for n in strong
        if steadiness(at.own[n]) < 0.35 and at.level[n] < 0.02 * max(at.full, 0.1)
    ]
    if at.full <= 0.0 or any(s.looks_like == "noise" for s in found):
        return found
    found += _as_at_rest(at, truths)
    found += _levels(at, truths, strong)
    known = {s.hookup for s in found}
    if not known & {at.text("short"), at.text("open")}:
        found += _signs(at, truths)
        known = {s.hookup for s in found}
    found += [s for s in _unchanged(at) if not known & {s.hookup, at.text(s.looks_like)}]
    found += [s for s in _moved_across(at) if s.hookup not in known]
    three = {n: at.own[n] for n in REFLECTIONS if n in truths}
    if len(three) == 3 and not found:
        found += _as_a_port(at, {n: truths[n] for n in REFLECTIONS}, three, f_hz)
    return found


def turned_at_rest(at: PortReadings, definitions: Definitions) -> bool:
    """Whether the port at rest reads like the opposite of an open, corrected with its three standards.

    A bare connector is an open with some fringing; one that reads like a short says that short and open were
    exchanged, if it is bare.
    """
    if not at.rest or not all(n in at.own and n in definitions for n in REFLECTIONS):
        return False
    box = box_of({n: np.asarray(definitions[n]) for n in REFLECTIONS}, {n: at.own[n] for n in REFLECTIONS})
    seen = np.median([size_and_side(box.correct(p)) for p in at.rest])
    return bool(seen < -0.5)


def size_and_side(plane: ComplexArray) -> float:
    """Median real part of the lower half of a sweep, where fringing turns an open least."""
    return middle(plane[: max(5, len(plane) // 2)].real)


def _as_at_rest(at: PortReadings, truths: Mapping[str, ComplexArray]) -> list[Suspicion]:
    """The port reads as it does while the other one is being served: then nothing was put on it."""
    found = []
    for name in truths:
        plane, within = at.own[name], _SAME * at.full
        if size(truths[name]) < 0.5 or name == "open":
            # Whoever leaves a load where it is while serving the other port has done nothing wrong. An open
            # is told from a bare connector by what it is defined to be, or not at all.
            differs = apart(truths[name], np.ones_like(truths[name]))
            within = min(within, 0.3 * differs * at.full)
            if name == "open" and differs < 0.02:
                continue
            if name != "open" and at.level[name] < _LIKE_LOAD * at.full:
                continue
        elif _opposite(at, truths) is True and "open" in at.own:
            continue
        alike = [apart(plane, rest) < within for rest in at.rest]
        if not (alike and alike[0]) and sum(alike) <= len(alike) / 2:
            continue  # what went wrong may be the later hook-up of the other port
        there = 3 - at.port
        if _elsewhere(at, name):
            reason = (
                f"Port {at.port} reads as if nothing were on it, and port {there} not as it does else at "
                "rest. Is it on the wrong port?"
            )
            found.append(Suspicion(at.text(name), reason, 0.96, name))
        else:
            reason = f"Port {at.port} reads as it does while port {there} is being served: nothing is on it."
            found.append(Suspicion(at.text(name), reason, 0.94, "nothing"))
    return found


def _elsewhere(at: PortReadings, name: str) -> bool:
    """Whether the other port read at this hook-up like the same standard there, or unlike at all others."""
    seen = at.across.get(name)
    if seen is None:
        return False
    full = max((size(p) for p in (*at.across.values(), *at.other.values())), default=0.0)
    there = at.other.get(name)
    if there is not None and apart(seen, there) < ALIKE * full:
        return True
    others = [p for n, p in at.across.items() if n != name]
    return bool(others) and all(apart(seen, p) > _SAME * full for p in others)


def _levels(at: PortReadings, truths: Mapping[str, ComplexArray], strong: list[str]) -> list[Suspicion]:
    """Short and open reflect all, a load next to nothing, whatever the port."""
    found: list[Suspicion] = []
    weak = [n for n in truths if size(truths[n]) < 0.2]
    most = max((at.level[n] for n in strong), default=0.0)
    for name in strong:
        if len(strong) > 1 and at.level[name] < _LIKE_LOAD * most:
            share = at.level[name] / most
            reason = f"It reflects {share:.0%} of what the others do, like a load; the {name} reflects all."
            found.append(Suspicion(at.text(name), reason, 0.92, "load"))
    low = next((s.hookup.split(" on ")[0] for s in found), "")
    for name in weak:
        ratio = at.level[name] / max(most, 1e-12)
        if not strong or ratio <= 0.6:
            continue
        if len(strong) == 1 and ratio > 2.0:
            reason = f"It reflects {ratio:.1f} times as much as the {strong[0]}: the two look exchanged."
            found.append(Suspicion(at.text(name), reason, 0.92, strong[0]))
            continue
        twin = next((n for n in strong if apart(at.own[n], at.own[name]) < ALIKE * at.full), "")
        reason = f"It reflects {ratio:.0%} of what short or open do; a {name} reflects next to nothing."
        if twin:
            reason = f"It reads like the {twin} on this port. Was the standard changed?"
        elif low:
            reason = f"It reflects {ratio:.0%} of what short or open do: {name} and {low} look exchanged."
        found.append(Suspicion(at.text(name), reason, 0.92, twin or low or "nothing"))
    return found


def _opposite(at: PortReadings, truths: Mapping[str, ComplexArray]) -> bool | None:
    """Whether short and open reflect with opposite sign, as they are defined to; None if that is not known.

    With the load's reading taken off, which is about the directivity, the ratio of the two readings is that
    of the definitions times ``(1 - es So) / (1 - es Ss)``, which no source match turns round.
    """
    if not {"short", "open"} <= set(truths) & set(at.own):
        return None
    floor: ComplexArray | float = 0.0
    if "load" in at.own and at.level["load"] < _LIKE_LOAD * at.full:
        floor = at.own["load"]
    with np.errstate(all="ignore"):
        ratio = (at.own["short"] - floor) * truths["open"] / ((at.own["open"] - floor) * truths["short"])
    return not middle(np.abs(ratio - 1.0)) > 1.0


def _signs(at: PortReadings, truths: Mapping[str, ComplexArray]) -> list[Suspicion]:
    """Short and open on the same side: one of them is not what it is called; what else is read says which."""
    if _opposite(at, truths) is not False:
        return []
    exact = apart(at.own["short"], at.own["open"]) < _SAME * at.full
    bare = [p for p in at.rest if size(p) > 0.5 * at.full]
    sides = [middle((at.own["short"] / p).real) for p in bare]
    first, last = (n for n in at.own if n in ("short", "open"))
    if sides and min(sides) > 0.3:
        reason = "It reads like the open on this port, and as the port does at rest: no short."
        return [Suspicion(at.text("short"), reason, 0.95, "open")]
    if sides and max(sides) < -0.3:
        reason = "It reads like the short on this port. Was the standard changed?"
        return [Suspicion(at.text("open"), reason, 0.95, "short")]
    if exact:
        again = f"It reads like the {first} on this port. Was the standard changed?"
        before = f"The {last} after it reads the same: one of them is not what it is called."
        return [
            Suspicion(at.text(last), again, 0.95, first),
            Suspicion(at.text(first), before, 0.8, last),
        ]
    if _elsewhere(at, "short"):
        reason = f"It reads nearly like the open, and port {3 - at.port} not as it does else at rest. "
        return [Suspicion(at.text("short"), f"{reason}Is it on the wrong port?", 0.93, "short")]
    reason = "It reads nearly like the open, as if nothing were on the port."
    return [Suspicion(at.text("short"), reason, 0.9, "nothing")]


def _unchanged(at: PortReadings) -> list[Suspicion]:
    """Two standards that read alike; levels and signs have said already what they can."""
    found = []
    for (one, a), (two, b) in combinations(at.own.items(), 2):
        share = size(a - b) / at.full
        if share < ALIKE:
            reason = f"It reads like the {one} on this port within {share:.1%} of a full reflection."
            found.append(Suspicion(at.text(two), f"{reason} Was the standard changed?", 0.95, one))
    return found


def _moved_across(at: PortReadings) -> list[Suspicion]:
    """The other port, which nobody has served yet, changed at one hook-up alone: it got what belongs here."""
    if at.other or len(at.across) < 3:
        return []
    full = max(size(p) for p in at.across.values())
    found = []
    for name, plane in at.across.items():
        others = [p for n, p in at.across.items() if n != name]
        still = all(apart(a, b) < 0.005 * full for a, b in combinations(others, 2))
        if full > 0.0 and still and all(apart(plane, p) > 0.02 * full for p in others):
            reason = (
                f"Port {3 - at.port}, not in use, reads otherwise than at the other hook-ups. "
                "Is it on the wrong port?"
            )
            found.append(Suspicion(at.text(name), reason, 0.85, name))
    return found


def _as_a_port(
    at: PortReadings,
    truths: Mapping[str, ComplexArray],
    three: Mapping[str, ComplexArray],
    f_hz: FloatArray,
) -> list[Suspicion]:
    """The error box of all three together."""
    looks, gain = exchanged(truths, three)
    if gain > 1.0:
        reason = "It looks like the {}; with that the test port makes sense, else not."
        sure = float(min(1.0 - 0.6 * np.exp(-gain / 6.0), 0.98))
        return [Suspicion(at.text(n), reason.format(m), sure, m) for n, m in looks.items() if n != m]
    box = box_of(truths, three)
    cost = box_cost(box)
    if cost > 20.0:
        expected = {"short": at.full, "open": at.full, "load": 0.0}
        worst = max(three, key=lambda n: abs(at.level[n] - expected[n]))
        reason = "Short, open and load on this port do not fit one test port; this one fits least."
        return [Suspicion(at.text(worst), reason, min(0.4 + cost / 200.0, 0.85), "loose")]
    coarse = middle(bends(box.tracking, f_hz)) > 0.5 * size(box.tracking)
    if at.rest or coarse or abs(delay_s(box.tracking, f_hz)) > 0.4 / float(np.max(np.diff(f_hz))):
        return []
    phase, unsure = intercept_rad(f_hz, box.tracking)
    if abs(phase) > np.pi - 0.9 and unsure < 0.5:
        # Only a hint: receivers may have a phase of their own.
        reason = "The test port's phase runs to half a turn at zero frequency: it looks like the {}."
        return [
            Suspicion(at.text(n), reason.format(m), 0.4, m) for n, m in (("short", "open"), ("open", "short"))
        ]
    return []
