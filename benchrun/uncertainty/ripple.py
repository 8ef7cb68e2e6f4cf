"""The ripple technique: effective directivity and source match of a port from a precision air line.

Behind the line stands a load of moderate reflection, then a short. What the line ends in beats, as it turns
with frequency, with what the port itself still reflects; half of the ripple of the linear magnitude is the
sum.

Sources: EURAMET cg-12 (text from memory); the algebra follows from the one-port error model,
``Gamma_m = delta + Gamma / (1 - mu Gamma)``: half ripples ``delta + mu |Gamma|^2`` and ``delta + mu``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["Ripple", "effective_terms", "half_ripple", "least_length_m"]

LIGHT = 299_792_458.0
"""Speed of light in vacuum, m/s (exact)."""


def least_length_m(low_hz: float, high_hz: float, periods: float = 2.0) -> float:
    """Length of an air line that beats so many times within a span.

    Ripple repeats every ``c / (2 l)``.

    Examples
    --------
    >>> round(least_length_m(1e9, 4e9, 3.0), 4)
    0.1499
    """
    return periods * LIGHT / (2.0 * (high_hz - low_hz))


def half_ripple(f_hz: FloatArray, reflection: ComplexArray, length_m: float) -> tuple[FloatArray, FloatArray]:
    """Half of the local peak-to-peak ripple of a linear magnitude.

    In a window of one beat period about each point a straight course and the beat, a cosine and a sine of the
    line's own period with its double, are fitted by least squares; half of the ripple is the beat's
    amplitude. That takes no particular sample for an extreme, so noise does not add up.

    Parameters
    ----------
    f_hz
        ``(f,)``, rising.
    reflection
        Of the line with what ends it, as corrected, ``(f,)``.
    length_m
        Of the air line.

    Returns
    -------
    f_hz, half
        Centres of the windows that lie wholly within the sweep, and the amplitudes, ``(k,)``.

    Raises
    ------
    ValueError
        If no whole period lies in the sweep, or fewer than eight points lie in a period.
    """
    period = LIGHT / (2.0 * length_m)
    if f_hz[-1] - f_hz[0] < period * (1 - 1e-9):
        raise ValueError(
            f"the sweep is {f_hz[-1] - f_hz[0]:.4g} Hz wide, and a line of {length_m:g} m beats every "
            f"{period:.4g} Hz; take a longer line or a wider sweep"
        )
    magnitude, centres, halves = np.abs(reflection), list[float](), list[float]()
    for centre in f_hz:
        inside = np.abs(f_hz - centre) <= period / 2.0 * (1 + 1e-9)
        if centre - f_hz[0] < period / 2 * (1 - 1e-9) or f_hz[-1] - centre < period / 2 * (1 - 1e-9):
            continue
        if inside.sum() < 8:
            raise ValueError(
                f"only {inside.sum()} points lie in a beat of {period:.4g} Hz; use at least 8 points"
            )
        x = (f_hz[inside] - centre) / period
        # A magnitude of a sum holds some of the doubled beat as well.
        waves = [wave(2 * np.pi * n * x) for n in (1, 2) for wave in (np.cos, np.sin)]
        basis = np.stack([*waves, np.ones_like(x), x], axis=-1)
        found = np.linalg.lstsq(basis, magnitude[inside], rcond=None)[0]
        centres.append(float(centre))
        halves.append(float(np.hypot(found[0], found[1])))
    return np.array(centres), np.array(halves)


@dataclass(frozen=True, slots=True, eq=False)
class Ripple:
    """Effective terms of a port, linear magnitudes.

    Parameters
    ----------
    f_hz
        ``(k,)``.
    directivity
        ``(k,)``.
    source_match
        ``(k,)``; not negative.
    """

    f_hz: FloatArray
    directivity: FloatArray
    source_match: FloatArray


def effective_terms(
    f_hz: FloatArray, with_load: ComplexArray, with_short: ComplexArray, length_m: float
) -> Ripple:
    """Solve both ripples for effective directivity and source match.

    ``h_load = delta + mu g^2`` and ``h_short = delta + mu``, with ``g`` the load's own magnitude. Both terms
    are taken to beat in phase, which bounds what they can be; the line's own impedance is part of the result.

    Parameters
    ----------
    f_hz
        ``(f,)``.
    with_load, with_short
        Corrected reflections of the line ended in a load of about 0.1 to 0.2, and in a short, ``(f,)``.
    length_m
        Of the line.

    Raises
    ------
    ValueError
        As :func:`half_ripple`; and if the load reflects as much as the short.
    """
    at_hz, load = half_ripple(f_hz, with_load, length_m)
    _, short = half_ripple(f_hz, with_short, length_m)
    size = np.interp(at_hz, f_hz, np.abs(with_load)) ** 2
    if np.any(size > 0.5):
        raise ValueError("the load reflects nearly as much as the short; use one of about 0.1 to 0.2")
    match = np.maximum(short - load, 0.0) / (1.0 - size)
    return Ripple(at_hz, np.maximum(load - match * size, 0.0), match)
