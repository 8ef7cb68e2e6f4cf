"""Which connections look wrong, judged from raw readings while a calibration is being made.

Nothing here stops anything: a suspicion is a sentence, a hook-up and a confidence. It compares each
reading with the others of its port, with the other port, and with what a test port may be at all. The
rules are our own; where one rests on a formula, that is named at the rule.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from benchrun.rf.calibration.method import Definitions, Readings
from benchrun.rf.calibration.one_port import REFLECTIONS, own_reflection
from benchrun.rf.calibration.plausibility import box_cost, box_of, exchanged, noisiness, steadiness
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["Suspicion", "suspect"]

_SINGLE = re.compile(r"^(?P<name>.+) on port (?P<port>\d)$")
_JOINING = re.compile(r"^(?P<name>.+) from port 1 to port 2$")

_ALIKE = 0.02
"""Two standards whose readings differ by less than this share of a full reflection are one."""

_SILENT = 10 ** (-50 / 20)
"""Level below which a join passes nothing."""


@dataclass(frozen=True, slots=True)
class Suspicion:
    """One connection that looks wrong.

    Parameters
    ----------
    hookup
        Text of the hook-up whose reading is doubted.
    reason
        One sentence: what the reading looks like, and why.
    confidence
        0 to 1; above 0.9 hands should be asked to look before going on.
    looks_like
        Name of the standard that it looks like; ``"nothing"``, ``"noise"``, ``"loose"``, or empty.
    """

    hookup: str
    reason: str
    confidence: float
    looks_like: str = ""


def suspect(definitions: Definitions, readings: Readings, f_hz: FloatArray) -> list[Suspicion]:
    """Doubt the readings made so far.

    Parameters
    ----------
    definitions
        What the standards are taken to be.
    readings
        By the text of their hook-ups, in the order in which they were made, ``(f,)`` each; as many as
        there are.
    f_hz
        ``(f,)``.

    Returns
    -------
    list of Suspicion
        The surest first; at most one a hook-up. Empty if all looks well.
    """
    found: list[Suspicion] = []
    good: dict[str, TwoPort] = {}
    for text, two in readings.items():
        single, joining = _SINGLE.match(text), _JOINING.match(text)
        if single and " and " not in text:
            planes = [own_reflection(two, int(single["port"]))]
        elif joining:
            planes = list(two.planes)
        else:
            continue
        broken = _broken(text, planes, f_hz)
        if broken:
            found.append(broken)
        else:
            good[text] = two
    ports: dict[int, dict[str, ComplexArray]] = {}
    for text, two in good.items():
        if single := _SINGLE.match(text):
            port = int(single["port"])
            ports.setdefault(port, {})[single["name"]] = own_reflection(two, port)
    for port, own in ports.items():
        found += _one_port(port, own, definitions, good, f_hz)
    found += _joins(good, ports, definitions)
    best: dict[str, Suspicion] = {}
    for one in sorted(found, key=lambda s: -s.confidence):
        best.setdefault(one.hookup, one)
    return list(best.values())


def _broken(text: str, planes: list[ComplexArray], f_hz: FloatArray) -> Suspicion | None:
    """Faults of a reading by itself."""
    if any(p.shape != f_hz.shape for p in planes):
        shape = next(p.shape for p in planes if p.shape != f_hz.shape)
        return Suspicion(text, f"It has {shape[-1]} points where the sweep has {len(f_hz)}.", 1.0)
    if not all(np.isfinite(p).all() for p in planes):
        return Suspicion(text, "It holds a value that is not a number.", 1.0)
    for plane in planes:
        if len(plane) >= 5 and np.any(plane) and np.mean(plane[1:] == plane[:-1]) > 0.5:
            return Suspicion(text, "It stands still: most points are exactly like the one before.", 0.95)
    return None


def _one_port(
    port: int,
    own: Mapping[str, ComplexArray],
    definitions: Definitions,
    readings: Readings,
    f_hz: FloatArray,
) -> list[Suspicion]:
    found: list[Suspicion] = []

    def text(name: str) -> str:
        return f"{name} on port {port}"

    strong = [n for n in own if n in definitions and _size(np.asarray(definitions[n])) > 0.5]
    full = max((_size(own[n]) for n in own), default=0.0)
    for name in strong:
        if steadiness(own[name]) < 0.35 and _size(own[name]) < 0.02 * max(full, 0.1):
            found.append(
                Suspicion(text(name), "It reads like noise: nothing reaches the receiver.", 0.95, "noise")
            )
    for (one, a), (two, b) in combinations(own.items(), 2):
        apart = _size(a - b)
        if full > 0.0 and apart < _ALIKE * full:
            reason = f"It reads like the {one} on this port within {apart / full:.1%} of a full reflection."
            found.append(Suspicion(text(two), f"{reason} Was the standard changed?", 0.95, one))
    found += _nothing_connected(port, own, definitions, readings, full)
    for name, plane in own.items():
        if _jumps(plane, full):
            found.append(Suspicion(text(name), "It jumps within the sweep: a loose contact.", 0.8, "loose"))
    if any(s.confidence > 0.9 for s in found):
        return found
    three = {n: own[n] for n in REFLECTIONS if n in own and n in definitions}
    if len(three) == 3:
        truths = {n: np.asarray(definitions[n]) for n in REFLECTIONS}
        looks, gain = exchanged(truths, three, f_hz)
        for name, other in looks.items():
            if name != other and gain > 1.0:
                reason = f"It looks like the {other}; with that the test port makes sense, else not."
                found.append(Suspicion(text(name), reason, _sure(gain), other))
        cost = box_cost(box_of(truths, three), f_hz)
        if gain <= 1.0 and cost > 20.0:
            worst = _least_fitting(three, full)
            reason = "Short, open and load on this port do not fit one test port; this one fits least."
            found.append(Suspicion(text(worst), reason, min(0.4 + cost / 200.0, 0.85), "loose"))
    return found + _levels(port, own, definitions)


def _nothing_connected(
    port: int,
    own: Mapping[str, ComplexArray],
    definitions: Definitions,
    readings: Readings,
    full: float,
) -> list[Suspicion]:
    """A port reads as it does while the other one is being served: then nothing was put on it.

    Needs an analyzer that reads both ports at every hook-up, and at least one hook-up of the other port.
    """
    other = 3 - port
    free = [own_reflection(two, port) for key, two in readings.items() if key.endswith(f" on port {other}")]
    free = [p for p in free if np.any(p)]
    found = []
    for name, plane in own.items():
        key = f"{name} on port {port}"
        like_free = [p for p in free if _size(_low(plane - p)) < _ALIKE * full]
        if not like_free or len(like_free) < len(free) / 2:
            continue
        across = own_reflection(readings[key], other)
        elsewhere = [
            n
            for n in REFLECTIONS
            if (there := readings.get(f"{n} on port {other}")) is not None
            and _size(_low(across - own_reflection(there, other))) < _ALIKE * full
        ]
        if name in elsewhere:
            reason = f"Port {port} reads as if nothing were on it, and port {other} reads like its {name}."
            found.append(Suspicion(key, f"{reason} Is it on the wrong port?", 0.95, name))
        elif name != "open" or _size(np.asarray(definitions.get("open", 1.0), np.complex128) - 1.0) > 0.3:
            reason = f"Port {port} reads as it does while port {other} is being served: nothing is on it."
            found.append(Suspicion(key, reason, 0.92, "nothing"))
    return found


def _levels(port: int, own: Mapping[str, ComplexArray], definitions: Definitions) -> list[Suspicion]:
    """What two readings tell before the third is there: a load reads far below a short or an open."""
    found: list[Suspicion] = []
    if len([n for n in REFLECTIONS if n in own]) == 3:
        return found
    strong = [n for n in own if n in definitions and _size(np.asarray(definitions[n])) > 0.5]
    weak = [n for n in own if n in definitions and _size(np.asarray(definitions[n])) < 0.2]
    for name in weak:
        for other in strong:
            ratio = _size(own[name]) / max(_size(own[other]), 1e-12)
            if ratio > 2.0:
                reason = f"It reflects {ratio:.1f} times as much as the {other}: the two look exchanged."
                found.append(Suspicion(f"{name} on port {port}", reason, 0.9, other))
            elif ratio > 0.6:
                reason = (
                    f"It reflects {ratio:.0%} of what the {other} does; a {name} reflects next to nothing."
                )
                found.append(Suspicion(f"{name} on port {port}", reason, 0.8, "nothing"))
    return found


def _joins(
    readings: Readings,
    ports: Mapping[int, Mapping[str, ComplexArray]],
    definitions: Definitions,
) -> list[Suspicion]:
    found: list[Suspicion] = []
    joins = {m["name"]: two for text, two in readings.items() if (m := _JOINING.match(text))}
    passing = {}
    for name, two in joins.items():
        text = f"{name} from port 1 to port 2"
        ways = [p for p in (two.s21, two.s12) if np.any(p)]
        level = min((_size(p) for p in ways), default=0.0)
        if level < _SILENT or min((steadiness(p) for p in ways), default=0.0) < 0.5:
            shown = 20.0 * np.log10(max(level, 1e-12))
            reason = f"Only {shown:.0f} dB pass, as if the ports were not joined."
            found.append(Suspicion(text, reason, 0.97, "nothing"))
            continue
        passing[name] = two
        if any(_jumps(p, _size(p)) for p in ways):
            found.append(Suspicion(text, "It jumps within the sweep: a loose contact.", 0.8, "loose"))
    for (one, a), (two_name, b) in combinations(passing.items(), 2):
        if _size(a.s21 - b.s21) < _ALIKE * _size(a.s21):
            reason = f"It reads like the {one}. Was the standard changed?"
            found.append(Suspicion(f"{two_name} from port 1 to port 2", reason, 0.95, one))
    if "thru" in passing:
        found += _against_thru(passing["thru"], ports, definitions)
    return found


def _against_thru(
    read: TwoPort, ports: Mapping[int, Mapping[str, ComplexArray]], definitions: Definitions
) -> list[Suspicion]:
    """Hold the thru against the standards of both ports.

    In the eight-term model the trackings satisfy ``eR eR' = (e10 e32)(e01 e23)``, and the thru measures the
    right side: an open taken for a short on one port turns the sign of the left one (Marks 1997).
    """
    thru = definitions.get("thru")
    complete = all(n in ports.get(p, {}) for p in (1, 2) for n in REFLECTIONS)
    if not isinstance(thru, TwoPort) or not complete or not (np.any(read.s12) and np.any(read.s21)):
        return []
    truths = {n: np.asarray(definitions[n]) for n in REFLECTIONS if n in definitions}
    if len(truths) < 3:
        return []
    one, two = (box_of(truths, {n: ports[p][n] for n in REFLECTIONS}) for p in (1, 2))
    with np.errstate(all="ignore"):
        inner = (1.0 - one.source_match * thru.s11) * (1.0 - two.source_match * thru.s22)
        loop = inner - one.source_match * two.source_match * thru.s12 * thru.s21
        ratio = read.s21 * read.s12 * loop**2 / (thru.s21 * thru.s12 * one.tracking * two.tracking)
    if not np.isfinite(ratio).all():
        return []
    text = "thru from port 1 to port 2"
    low = _low(ratio)
    middle = complex(np.median(low.real), np.median(low.imag))
    if middle.real < -0.5 * abs(middle) and abs(middle) > 0.3:
        reason = (
            "Its sign contradicts the standards: on one of the ports short and open look exchanged, or the "
            "thru is half a wave longer than it is defined."
        )
        return [Suspicion(text, reason, 0.9)]
    off_db = 10.0 * np.log10(max(abs(middle), 1e-12))
    if abs(off_db) > 1.5:
        more = "less" if off_db < 0.0 else "more"
        reason = f"It passes {abs(off_db):.1f} dB {more} than the standards of both ports say it should."
        return [Suspicion(text, reason, float(min(0.5 + abs(off_db) / 10.0, 0.95)), "loose")]
    return []


def _size(plane: ComplexArray) -> float:
    return float(np.median(np.abs(plane)))


def _low(plane: ComplexArray) -> ComplexArray:
    """Lower quarter of the sweep, where offsets that no definition holds and moved cables turn least."""
    return plane[: max(5, len(plane) // 4)]


def _jumps(plane: ComplexArray, full: float) -> bool:
    """Whether single points leave the trace by far more than the others, and by something that matters."""
    typical, greatest = noisiness(plane)
    return greatest > 25.0 * typical and greatest > 0.05 * full


def _least_fitting(own: Mapping[str, ComplexArray], full: float) -> str:
    """Name the standard whose level is least like what it should be: two full reflections, one small."""
    expected = {"short": full, "open": full, "load": 0.0}
    return max(own, key=lambda n: abs(_size(own[n]) - expected[n]))


def _sure(gain: float) -> float:
    return float(min(1.0 - 0.6 * np.exp(-gain / 6.0), 0.98))
