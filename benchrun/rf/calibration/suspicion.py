"""Which connections look wrong, judged from raw readings while a calibration is being made.

Nothing here stops anything: a suspicion is a sentence, a hook-up and a confidence. It compares each
reading with the others of its port, with the other port, and with what a test port may be at all.
"""

from __future__ import annotations

import re

import numpy as np

from benchrun.rf.calibration.doubts import Suspicion, jumps, size, surest
from benchrun.rf.calibration.join_doubts import doubt_joins
from benchrun.rf.calibration.method import Definitions, Readings
from benchrun.rf.calibration.one_port import own_reflection
from benchrun.rf.calibration.port_doubts import PortReadings, doubt_port
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["SURE", "Suspicion", "suspect", "unsteady"]

SURE = 0.6
"""Confidence from which a connection should be made again; below it a suspicion is a hint."""

_SINGLE = re.compile(r"^(?P<name>.+) on port (?P<port>\d)$")
_JOINING = re.compile(r"^(?P<name>.+) from port 1 to port 2$")

_POINTS = 201
"""Points that stand for a sweep where levels, signs and boxes are told from each other."""

_STEADY = 3e-4
"""Share of a full reflection within which two sweeps of one connection agree, noise apart: 70 dB."""


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
    if all(_silent(two) for two in readings.values()):
        return []  # nothing reaches the receivers at all: no connection is to blame for that
    found: list[Suspicion] = []
    good: dict[str, TwoPort] = {}
    for text, two in readings.items():
        single, joining = _single(text), _JOINING.match(text)
        if single:
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
    found += _jumping(good, f_hz)
    # A couple of hundred points tell levels, signs and boxes as well as thousands do.
    some = slice(None, None, -(-len(f_hz) // _POINTS))
    thin = {text: two.map(lambda plane: plane[some]) for text, two in good.items()}
    thin_definitions = {
        name: d.map(lambda plane: plane[some]) if isinstance(d, TwoPort) else np.asarray(d)[some]
        for name, d in definitions.items()
    }
    ports = {port: at for port in (1, 2) if (at := _at(port, thin)).own}
    for at in ports.values():
        found += doubt_port(at, thin_definitions, f_hz[some])
    joins = {m["name"]: two for text, two in thin.items() if (m := _JOINING.match(text))}
    # What the thru says about standards means nothing while one of them is known to be wrong.
    believed = {} if any(s.confidence > SURE for s in found) else ports
    return surest(found + doubt_joins(joins, believed, thin_definitions))


def _jumping(readings: Readings, f_hz: FloatArray) -> list[Suspicion]:
    """Traces that break off somewhere within the sweep."""
    full = max((size(p) for two in readings.values() for p in (two.s11, two.s22)), default=0.0)
    found = []
    for text, two in readings.items():
        single = _single(text)
        planes = [own_reflection(two, int(single["port"]))] if single else [two.s21, two.s12]
        if any(np.any(p) and jumps(p, f_hz, full if single else size(p)) for p in planes):
            found.append(Suspicion(text, "It jumps within the sweep: a loose contact.", 0.8, "loose"))
    return found


def unsteady(hookup: str, once: TwoPort, again: TwoPort) -> Suspicion | None:
    """Doubt a connection whose two sweeps, one after the other, do not agree: a contact that wanders.

    A loose load reads like another good load, and no other standard knows better; but not so twice.

    Parameters
    ----------
    hookup
        Text of the hook-up.
    once, again
        Its two readings, ``(f,)``.

    Returns
    -------
    Suspicion or None
        None if they agree within 70 dB of a full reflection, noise apart.

    Notes
    -----
    Noise is new at every point and a contact is not, so that what the differences of neighbouring points have
    in common is free of noise in the mean; its own scatter is allowed for three times over.
    """
    single = _single(hookup)
    pairs = list(zip(once.planes, again.planes, strict=True))
    if single:
        port = int(single["port"])
        pairs = [(own_reflection(once, port), own_reflection(again, port))]
    full = max(float(np.max(np.abs(p))) for p in (*once.planes, *again.planes))
    for one, two in pairs:
        moved = _moved(one - two)
        if moved > _STEADY * full:
            reason = (
                f"Two sweeps one after the other differ by {moved / full:.2%} of a full reflection, more "
                "than noise does: a loose contact."
            )
            return Suspicion(hookup, reason, 0.95, "loose")
    return None


def _moved(difference: ComplexArray) -> float:
    if len(difference) < 5 or not np.isfinite(difference).all():
        return 0.0
    power = np.abs(difference) ** 2
    common = float(np.abs(np.mean(difference[1:] * np.conj(difference[:-1]))))
    scatter = float(np.mean(power)) / np.sqrt(len(difference) - 1)
    return float(np.sqrt(max(common - 3.0 * scatter, 0.0)))


def _silent(two: TwoPort) -> bool:
    return all(float(np.max(np.abs(p), initial=0.0)) < 1e-9 for p in two.planes)


def _single(text: str) -> re.Match[str] | None:
    return None if " and " in text else _SINGLE.match(text)


def _at(port: int, readings: Readings) -> PortReadings:
    """Sort out what is known of a port."""
    own: dict[str, ComplexArray] = {}
    across: dict[str, ComplexArray] = {}
    other: dict[str, ComplexArray] = {}
    rest: list[ComplexArray] = []
    for text, two in readings.items():
        single = _single(text)
        if single is None:
            continue
        here, there = own_reflection(two, port), own_reflection(two, 3 - port)
        if int(single["port"]) == port:
            own[single["name"]] = here
            if np.any(there):
                across[single["name"]] = there
        else:
            other[single["name"]] = there
            if np.any(here):
                rest.append(here)
    return PortReadings(port, own, across, tuple(rest), other)


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
