"""Filters from prototypes: low-pass, high-pass, band-pass, band-stop, at any impedance.

The usual transforms of frequency (Matthaei, Young and Jones; Pozar, ch. 8; from memory). Band filters are
geometrically symmetric: the centre is the root of both edges' product.
"""

from __future__ import annotations

import math
from collections.abc import Callable

from benchrun.rf.design.ladder import Ladder
from benchrun.rf.design.parts import Branch, Part
from benchrun.rf.design.prototype import Prototype

__all__ = ["band_pass", "band_stop", "high_pass", "low_pass"]


def low_pass(prototype: Prototype, cutoff_hz: float, source_ohm: float = 50.0) -> Ladder:
    """Scale a prototype.

    Raises
    ------
    ValueError
        For a frequency or resistance that is not positive.

    Examples
    --------
    >>> from benchrun.rf.design.prototype import butterworth
    >>> filter = low_pass(butterworth(3), 1e9)
    >>> [f"{p.value:.4e}" for p in filter.parts]
    ['3.1831e-12', '1.5915e-08', '3.1831e-12']
    """
    w, r = _checked(cutoff_hz, source_ohm)
    return _built(
        prototype, "low-pass", r,
        lambda g: Branch("series", (Part("coil", g * r / w),)),
        lambda g: Branch("shunt", (Part("capacitor", g / (r * w)),)),
    )  # fmt: skip


def high_pass(prototype: Prototype, cutoff_hz: float, source_ohm: float = 50.0) -> Ladder:
    """Turn a prototype about its cut-off.

    Raises
    ------
    ValueError
        As of :func:`low_pass`.
    """
    w, r = _checked(cutoff_hz, source_ohm)
    return _built(
        prototype, "high-pass", r,
        lambda g: Branch("series", (Part("capacitor", 1.0 / (r * w * g)),)),
        lambda g: Branch("shunt", (Part("coil", r / (w * g)),)),
    )  # fmt: skip


def band_pass(prototype: Prototype, low_hz: float, high_hz: float, source_ohm: float = 50.0) -> Ladder:
    """Pass from one edge to the other.

    Raises
    ------
    ValueError
        For edges that do not increase from above 0, or a resistance that is not positive.
    """
    w0, width, r = _band(low_hz, high_hz, source_ohm)
    return _built(
        prototype, "band-pass", r,
        lambda g: _pair("series", "series", g * r / (width * w0), width / (w0 * g * r)),
        lambda g: _pair("shunt", "parallel", width * r / (w0 * g), g / (width * w0 * r)),
    )  # fmt: skip


def band_stop(prototype: Prototype, low_hz: float, high_hz: float, source_ohm: float = 50.0) -> Ladder:
    """Stop between the edges, where the prototype has its cut-off.

    Raises
    ------
    ValueError
        As of :func:`band_pass`.
    """
    w0, width, r = _band(low_hz, high_hz, source_ohm)
    return _built(
        prototype, "band-stop", r,
        lambda g: _pair("series", "parallel", width * g * r / w0, 1.0 / (width * w0 * g * r)),
        lambda g: _pair("shunt", "series", r / (w0 * width * g), width * g / (w0 * r)),
    )  # fmt: skip


def _pair(place: str, joined: str, henry: float, farad: float) -> Branch:
    return Branch(place, (Part("coil", henry), Part("capacitor", farad)), joined)


def _built(
    prototype: Prototype,
    what: str,
    r: float,
    series: Callable[[float], Branch],
    shunt: Callable[[float], Branch],
) -> Ladder:
    elements, place = [], prototype.first
    for g in prototype.g:
        elements.append((series if place == "series" else shunt)(g))
        place = "series" if place == "shunt" else "shunt"
    return Ladder(f"{what}, {prototype.name}", tuple(elements), r, r * prototype.load)


def _checked(hz: float, ohm: float) -> tuple[float, float]:
    if not (hz > 0 and math.isfinite(hz)):
        raise ValueError(f"a filter at {hz:g} Hz cannot be built; the frequency must be above 0")
    if not (ohm > 0 and math.isfinite(ohm)):
        raise ValueError(f"a filter at {ohm:g} ohm cannot be built; the resistance must be above 0")
    return 2.0 * math.pi * hz, ohm


def _band(low_hz: float, high_hz: float, ohm: float) -> tuple[float, float, float]:
    if not 0 < low_hz < high_hz < math.inf:
        raise ValueError(f"a band from {low_hz:g} Hz to {high_hz:g} Hz does not increase from above 0")
    w0, r = _checked(math.sqrt(low_hz * high_hz), ohm)
    return w0, 2.0 * math.pi * (high_hz - low_hz) / w0, r
