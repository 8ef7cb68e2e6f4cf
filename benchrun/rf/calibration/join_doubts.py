"""Doubts about what joins the ports, held against each other and against the standards of both ports."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import combinations
from typing import cast

import numpy as np

from benchrun.rf.calibration.doubts import ALIKE, Suspicion, size
from benchrun.rf.calibration.method import Definitions
from benchrun.rf.calibration.one_port import REFLECTIONS
from benchrun.rf.calibration.plausibility import box_of, steadiness
from benchrun.rf.calibration.port_doubts import PortReadings, turned_at_rest
from benchrun.rf.twoport import ComplexArray, TwoPort

__all__ = ["JOINED", "doubt_joins"]

JOINED = "{} from port 1 to port 2"

_SILENT = 10 ** (-50 / 20)
"""Level below which a join passes nothing."""

_OFF_DB = 0.3
"""By which the thru may disagree with the standards in the lower quarter of a sweep, one way. A sound kit
does by less than a tenth there, and even ideal definitions do."""


def doubt_joins(
    joins: Mapping[str, TwoPort],
    ports: Mapping[int, PortReadings],
    definitions: Definitions,
) -> list[Suspicion]:
    """All doubts about joins, and what the thru tells about the ports; empty if they look well.

    Parameters
    ----------
    joins
        Readings by the name of the standard, in the order of making.
    ports
        What is known of each port.
    """
    found: list[Suspicion] = []
    passing: dict[str, TwoPort] = {}
    for name, two in joins.items():
        text = JOINED.format(name)
        ways = [p for p in (two.s21, two.s12) if np.any(p)]
        level = min((size(p) for p in ways), default=0.0)
        if level < _SILENT or min((steadiness(p) for p in ways), default=0.0) < 0.5:
            shown = 20.0 * np.log10(max(level, 1e-12))
            reason = f"Only {shown:.0f} dB pass, as if the ports were not joined."
            found.append(Suspicion(text, reason, 0.97, "nothing"))
            continue
        passing[name] = two
    for (one, a), (two_name, b) in combinations(passing.items(), 2):
        if size(a.s21 - b.s21) < ALIKE * size(a.s21):
            reason = f"It reads like the {one}. Was the standard changed?"
            found.append(Suspicion(JOINED.format(two_name), reason, 0.95, one))
    if "thru" in passing:
        found += _against_ports(passing["thru"], ports, definitions)
    return found


def _against_ports(
    read: TwoPort, ports: Mapping[int, PortReadings], definitions: Definitions
) -> list[Suspicion]:
    """Hold the thru against the standards of both ports.

    In the eight-term model the trackings satisfy ``eR eR' = (e10 e32)(e01 e23)``, and the thru measures the
    right side, receivers' phases and all: an open taken for a short on one port turns the sign of the left
    one (Marks 1997).
    """
    ratio = _over_standards(read, ports, definitions)
    if ratio is None:
        return []
    text = JOINED.format("thru")
    low = ratio[: max(5, len(ratio) // 4)]
    middle = complex(np.median(low.real), np.median(low.imag))
    if middle.real < -0.5 * abs(middle) and abs(middle) > 0.3:
        reason = (
            "Its sign contradicts the standards: on one of the ports short and open look exchanged, or the "
            "thru is half a wave longer than it is defined."
        )
        return [Suspicion(text, reason, 0.9), *_turned(ports, definitions)]
    off_db = 10.0 * np.log10(max(abs(middle), 1e-12))
    if abs(off_db) > _OFF_DB:
        more = "less" if off_db < 0.0 else "more"
        sure = float(min(0.65 + abs(off_db) / 10.0, 0.95))
        reason = f"It passes {abs(off_db):.1f} dB {more} than the standards of both ports say it should."
        lossy = [] if off_db < 0.0 else _lossy_short(ports, sure)
        return [*lossy, Suspicion(text, reason, 0.9 * sure if lossy else sure, "loose")]
    return []


def _lossy_short(ports: Mapping[int, PortReadings], sure: float) -> list[Suspicion]:
    """The short that gives back less than the open of its port, if one port has such."""
    low_db = {
        port: 20.0 * np.log10(size(at.own["short"] - at.own["load"]) / size(at.own["open"] - at.own["load"]))
        for port, at in ports.items()
    }
    port = min(low_db, key=lambda p: low_db[p])
    if low_db[port] > -0.4 or abs(low_db[1] - low_db[2]) < 0.3:
        return []
    reason = f"It gives back {-low_db[port]:.1f} dB less than the open, and the thru says that is too little."
    return [Suspicion(ports[port].text("short"), reason, sure, "loose")]


def _over_standards(
    read: TwoPort, ports: Mapping[int, PortReadings], definitions: Definitions
) -> ComplexArray | None:
    """Transmission there and back over what both ports' trackings make of it, ``(f,)``; 1 if all is well."""
    complete = all(p in ports and n in ports[p].own for p in (1, 2) for n in REFLECTIONS)
    defined = all(n in definitions for n in (*REFLECTIONS, "thru"))
    if not complete or not defined or not (np.any(read.s12) and np.any(read.s21)):
        return None
    thru = cast(TwoPort, definitions["thru"])
    truths = {n: np.asarray(definitions[n]) for n in REFLECTIONS}
    one, two = (box_of(truths, {n: ports[p].own[n] for n in REFLECTIONS}) for p in (1, 2))
    with np.errstate(all="ignore"):
        inner = (1.0 - one.source_match * thru.s11) * (1.0 - two.source_match * thru.s22)
        loop = inner - one.source_match * two.source_match * thru.s12 * thru.s21
        ratio = read.s21 * read.s12 * loop**2 / (thru.s21 * thru.s12 * one.tracking * two.tracking)
    return np.asarray(ratio) if np.isfinite(ratio).all() else None


def _turned(ports: Mapping[int, PortReadings], definitions: Definitions) -> list[Suspicion]:
    """Which port it is: the one that reads at rest like a short, if only one does."""
    turned = [at for at in ports.values() if turned_at_rest(at, definitions)]
    if len(turned) != 1:
        return []
    reason = "It looks like the {}: the thru's sign says so, and the port as it reads at rest."
    return [
        Suspicion(turned[0].text(n), reason.format(m), 0.95, m)
        for n, m in (("short", "open"), ("open", "short"))
    ]
