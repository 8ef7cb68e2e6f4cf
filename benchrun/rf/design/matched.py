"""How a matching network does away from its frequency, and with parts that can be bought."""

from __future__ import annotations

import numpy as np

from benchrun.rf.design.ladder import Ladder
from benchrun.rf.figures.band import at
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["input_vswr", "load_over", "matched_band", "matched_yield", "node_q"]


def load_over(f_hz: FloatArray, load_ohm: complex, at_hz: float) -> ComplexArray:
    """Continue one impedance over frequency: its resistance with a coil or a capacitor in series.

    The plainest model that has the value at ``at_hz``; where the load was measured, use the reading instead.

    Returns
    -------
    numpy.ndarray
        Ohm, ``(f,)``.
    """
    x = load_ohm.imag * (f_hz / at_hz if load_ohm.imag >= 0 else at_hz / f_hz)
    return np.asarray(load_ohm.real + 1j * x)


def _reflection(
    ladder: Ladder, f_hz: FloatArray, load_ohm: ComplexArray, factors: FloatArray | None = None
) -> ComplexArray:
    gamma = (load_ohm - ladder.load_ohm) / (load_ohm + ladder.load_ohm)
    return ladder.response(f_hz, factors).terminated(gamma)


def input_vswr(
    ladder: Ladder, f_hz: FloatArray, load_ohm: ComplexArray, factors: FloatArray | None = None
) -> FloatArray:
    """VSWR that the source sees, ``(..., f)``; infinite where all comes back.

    Parameters
    ----------
    ladder
        From source to load.
    f_hz
        ``(f,)``.
    load_ohm
        At each frequency, ``(f,)``.
    factors
        As of :meth:`.Ladder.response`.
    """
    size = np.abs(_reflection(ladder, f_hz, load_ohm, factors))
    return np.asarray(np.where(size < 1.0, (1.0 + size) / np.where(size < 1.0, 1.0 - size, 1.0), np.inf))


def matched_band(
    ladder: Ladder, f_hz: FloatArray, load_ohm: ComplexArray, at_hz: float, vswr: float = 2.0
) -> tuple[float, float]:
    """Band around a frequency in which the VSWR stays at or below a value.

    Outwards from ``at_hz`` to the first crossing on either side; between samples linear in the magnitude of
    the reflection.

    Parameters
    ----------
    ladder, f_hz, load_ohm
        As of :func:`input_vswr`.
    at_hz
        Inside ``f_hz``.
    vswr
        Above 1.

    Returns
    -------
    low_hz, high_hz
        nan where the match reaches beyond that end of ``f_hz``; both nan where ``at_hz`` is not matched.

    Raises
    ------
    ValueError
        If ``at_hz`` lies outside, or the VSWR is not above 1.
    """
    if not vswr > 1.0:
        raise ValueError(f"a VSWR of {vswr:g} bounds no band; it must be above 1")
    if not f_hz[0] <= at_hz <= f_hz[-1]:
        raise ValueError(
            f"{at_hz:g} Hz lies outside the frequencies given, {f_hz[0]:g} Hz to {f_hz[-1]:g} Hz"
        )
    limit = (vswr - 1.0) / (vswr + 1.0)
    size = np.abs(_reflection(ladder, f_hz, load_ohm))
    here = float(at(f_hz, size, at_hz)[0])
    if here > limit:
        return np.nan, np.nan
    edges: list[float] = []
    for side in (f_hz < at_hz, f_hz > at_hz):
        step = -1 if not len(edges) else 1
        f = np.concatenate([[at_hz], f_hz[side][::step]])
        s = np.concatenate([[here], size[side][::step]])
        out = np.flatnonzero(s > limit)
        if not len(out):
            edges.append(np.nan)
            continue
        i = out[0]
        weight = (limit - s[i - 1]) / (s[i] - s[i - 1])
        edges.append(float(f[i - 1] + weight * (f[i] - f[i - 1])))
    return edges[0], edges[1]


def matched_yield(
    ladder: Ladder, f_hz: FloatArray, load_ohm: ComplexArray, vswr: float, draws: int = 1000, seed: int = 1
) -> float:
    """Share of pieces, parts drawn within their tolerances, whose VSWR holds at all frequencies given."""
    found = input_vswr(ladder, f_hz, load_ohm, ladder.factors(draws, seed))
    return float(np.mean(np.all(found <= vswr, axis=-1)))


def node_q(ladder: Ladder, at_hz: float, load_ohm: complex) -> float:
    """Greatest ``|X| / R`` of the impedances seen towards the load, at each joint of the network.

    The higher, the narrower the match, and the more its parts lose. For an L section to a real load it is
    ``sqrt(R_high / R_low - 1)``.
    """
    f, z = np.array([at_hz]), complex(load_ohm)
    found = abs(z.imag) / z.real
    for element in ladder.elements[::-1]:
        a, b, c, d = (complex(x[0]) for x in element.chain(f, np.ones(len(element.varying))))
        z = (a * z + b) / (c * z + d)
        found = max(found, abs(z.imag) / z.real)
    return found
