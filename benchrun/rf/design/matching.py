r"""Matching networks between a real source and a given impedance: all L, pi and tee sections, one stub.

Formulas at one frequency (L: as in any microwave text; pi and tee: two L sections back to back with a chosen
Q; stubs: from the circle of unit conductance or resistance). Every choice is a :class:`.Ladder` from the
source (port 1) to the load (port 2); how it behaves elsewhere is worked out from that, with the load's own
frequency response.
"""

from __future__ import annotations

import math
from collections.abc import Iterator

from benchrun.rf.design.ladder import Ladder
from benchrun.rf.design.parts import Branch, Element, Line, Part, Stub

__all__ = ["l_sections", "pi_sections", "stubs", "tee_sections"]

_NOTHING = 1e-9
"""Reactance over the source's resistance below which no part is needed."""


def l_sections(load_ohm: complex, at_hz: float, source_ohm: float = 50.0) -> tuple[Ladder, ...]:
    """Two reactances: all that match, four at most.

    Parameters
    ----------
    load_ohm
        With a positive resistance.
    at_hz
        Where it is matched.
    source_ohm
        Positive.

    Returns
    -------
    tuple of Ladder
        Named by what stands from the source on. Parts that would be none are left out.

    Raises
    ------
    ValueError
        For a load without resistance, or values that are not positive.

    Examples
    --------
    >>> for ladder in l_sections(25 + 0j, 1e9):
    ...     print(ladder.name, [f"{p.value:.5g}" for p in ladder.parts])
    shunt capacitor, series coil ['3.1831e-12', '3.9789e-09']
    shunt coil, series capacitor ['7.9577e-09', '6.3662e-12']
    """
    r, x = _checked(load_ohm, at_hz, source_ohm)
    found = []
    size = r * r + x * x
    if size >= source_ohm * r * (1 - 1e-12):  # shunt at the load
        root = math.sqrt(max(size - source_ohm * r, 0.0))
        for sign in (1.0, -1.0):
            b = (x + sign * math.sqrt(r / source_ohm) * root) / size
            g, rest = r / size, b - x / size
            series = rest / (g * g + rest * rest)  # what takes away the reactance of 1 / (g + j rest)
            found.append(_lumped(at_hz, source_ohm, ("series", series), ("shunt", b)))
    if r <= source_ohm * (1 + 1e-12):  # series at the load
        root = math.sqrt(max(r * (source_ohm - r), 0.0))
        for sign in (1.0, -1.0):
            b = sign * math.sqrt(max(source_ohm - r, 0.0) / r) / source_ohm
            found.append(_lumped(at_hz, source_ohm, ("shunt", b), ("series", sign * root - x)))
    return _unlike(found)


def pi_sections(load_ohm: complex, at_hz: float, q: float, source_ohm: float = 50.0) -> tuple[Ladder, ...]:
    """Shunt, series, shunt, with the greater of both sides' Q chosen.

    Raises
    ------
    ValueError
        As of :func:`l_sections`, or for a Q below that of the L section, which both sides need.
    """
    r, x = _checked(load_ohm, at_hz, source_ohm)
    g, b = r / (r * r + x * x), -x / (r * r + x * x)
    middle = max(source_ohm, 1.0 / g) / (1.0 + q * q)
    _reachable(q, max(source_ohm, 1.0 / g) / min(source_ohm, 1.0 / g))
    q1 = math.sqrt(max(source_ohm / middle - 1.0, 0.0))
    q2 = math.sqrt(max(1.0 / g / middle - 1.0, 0.0))
    found = [
        _lumped(
            at_hz, source_ohm, ("shunt", s1 * q1 / source_ohm), ("series", middle * (s1 * q1 + s2 * q2)),
            ("shunt", s2 * q2 * g - b),
        )
        for s1, s2 in _signs()
    ]  # fmt: skip
    return _unlike(found)


def tee_sections(load_ohm: complex, at_hz: float, q: float, source_ohm: float = 50.0) -> tuple[Ladder, ...]:
    """Series, shunt, series, with the greater of both sides' Q chosen.

    Raises
    ------
    ValueError
        As of :func:`pi_sections`.
    """
    r, x = _checked(load_ohm, at_hz, source_ohm)
    middle = min(source_ohm, r) * (1.0 + q * q)
    _reachable(q, max(source_ohm, r) / min(source_ohm, r))
    q1 = math.sqrt(max(middle / source_ohm - 1.0, 0.0))
    q2 = math.sqrt(max(middle / r - 1.0, 0.0))
    found = [
        _lumped(
            at_hz, source_ohm, ("series", s1 * q1 * source_ohm), ("shunt", (s1 * q1 + s2 * q2) / middle),
            ("series", s2 * q2 * r - x),
        )
        for s1, s2 in _signs()
    ]  # fmt: skip
    return _unlike(found)


def stubs(load_ohm: complex, at_hz: float, source_ohm: float = 50.0) -> tuple[Ladder, ...]:
    """One stub at a distance from the load: open or short, in shunt or in series, each at two places.

    Line and stub have the source's impedance. Lengths are below half a wavelength; for a longer choice add
    half a wavelength to either.

    Returns
    -------
    tuple of Ladder
        Eight, or none for a load that is matched already.

    Raises
    ------
    ValueError
        As of :func:`l_sections`.
    """
    r, x = _checked(load_ohm, at_hz, source_ohm)
    z = complex(r, x)
    gamma = (z - source_ohm) / (z + source_ohm)
    rho = abs(gamma)
    if rho < _NOTHING:
        return ()
    found = []
    for place in ("shunt", "series"):
        for sign in (1.0, -1.0):
            # y = 1 + j b (shunt) or z = 1 + j b (series) is met where |gamma| is the load's.
            b = sign * 2.0 * rho / math.sqrt(1.0 - rho * rho)
            wanted = 1j * b / (2.0 + 1j * b) * (-1.0 if place == "shunt" else 1.0)
            turn = (math.atan2(gamma.imag, gamma.real) - math.atan2(wanted.imag, wanted.real)) % (2 * math.pi)
            for end in ("open", "short"):
                # Susceptance -b of an open is tan, of a short -cot; reactances the other way round.
                tangent = -b if (end == "open") == (place == "shunt") else 1.0 / b
                length = (math.atan(tangent) % math.pi) / (2 * math.pi)
                stub = Stub(place, end, Line(source_ohm, length, at_hz))
                way = Line(source_ohm, turn / (4 * math.pi), at_hz)
                found.append(Ladder(f"{place} stub, {end}", (stub, way), source_ohm, source_ohm))
    return tuple(found)


def _lumped(at_hz: float, source_ohm: float, *pieces: tuple[str, float]) -> Ladder:
    """Build from reactances (series, ohm) and susceptances (shunt, siemens)."""
    elements: list[Element] = []
    words = []
    w = 2.0 * math.pi * at_hz
    for place, value in pieces:
        size = abs(value) * (source_ohm if place == "shunt" else 1.0 / source_ohm)
        if size < _NOTHING:
            continue
        if place == "series":
            part = Part("coil", value / w) if value > 0 else Part("capacitor", -1.0 / (w * value))
        else:
            part = Part("capacitor", value / w) if value > 0 else Part("coil", -1.0 / (w * value))
        elements.append(Branch(place, (part,)))
        words.append(f"{place} {part.kind}")
    return Ladder(", ".join(words) or "a wire", tuple(elements), source_ohm, source_ohm)


def _unlike(found: list[Ladder]) -> tuple[Ladder, ...]:
    """Leave out what is there already: on the edge between two kinds several become one."""
    kept: list[Ladder] = []
    for one in found:
        if not any(_alike(one, other) for other in kept):
            kept.append(one)
    return tuple(kept)


def _alike(one: Ladder, other: Ladder) -> bool:
    return one.name == other.name and all(
        abs(a.value / b.value - 1.0) < 1e-6 for a, b in zip(one.parts, other.parts, strict=True)
    )


def _signs() -> Iterator[tuple[float, float]]:
    return ((a, b) for a in (1.0, -1.0) for b in (1.0, -1.0))


def _reachable(q: float, ratio: float) -> None:
    least = math.sqrt(ratio - 1.0)
    if not (q > 0 and q >= least * (1 - 1e-12)):
        raise ValueError(
            f"a Q of {q:g} cannot be had with three parts between these resistances; allowed are {least:.4g} "
            "and more"
        )


def _checked(load_ohm: complex, at_hz: float, source_ohm: float) -> tuple[float, float]:
    r, x = float(complex(load_ohm).real), float(complex(load_ohm).imag)
    if not (r > 0 and math.isfinite(r) and math.isfinite(x)):
        raise ValueError(
            f"a load of {r:g} {x:+g}j ohm takes no power; it needs a resistance above 0 to be matched"
        )
    if not (at_hz > 0 and math.isfinite(at_hz) and source_ohm > 0 and math.isfinite(source_ohm)):
        raise ValueError(f"a match to {source_ohm:g} ohm at {at_hz:g} Hz: both must be above 0")
    return r, x
