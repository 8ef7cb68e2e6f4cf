"""Straight and parabolic parts of a trace over a band, by least squares that do not mind the grid."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.rf.twoport import FloatArray

__all__ = ["Fit", "fit"]


@dataclass(frozen=True, slots=True, eq=False)
class Fit:
    """A trace in parts: ``level + linear * x + parabolic * x**2 + rest``, x from -1 to +1 over the band.

    Parameters
    ----------
    mean
        Mean over the band, ``(...,)``.
    linear, parabolic
        Coefficients of x and of x squared, in the unit of the trace, ``(...,)``; ``linear`` is half the
        change across the band, ``parabolic`` the rise from the middle to an edge.
    rest
        What the fit leaves, ``(..., k)``.
    """

    mean: FloatArray
    linear: FloatArray
    parabolic: FloatArray
    rest: FloatArray


def fit(f_hz: FloatArray, values: FloatArray, degree: int) -> Fit:
    """Split a trace by least squares into a mean, a straight line and, with degree 2, a parabola.

    Each sample weighs as much as the stretch of band it stands for (trapezoidal rule), so that a
    logarithmic or a denser grid draws the same line: the sums converge to integrals over the band.

    Parameters
    ----------
    f_hz
        ``(k,)``, the first and last are the edges of the band; at least two.
    values
        ``(..., k)``.
    degree
        1 or 2.

    Returns
    -------
    Fit

    Examples
    --------
    >>> import numpy as np
    >>> x = np.linspace(-1.0, 1.0, 401)
    >>> parts = fit(x, 3.0 - 2.0 * x + 5.0 * x**2, 2)
    >>> [round(float(v), 9) for v in (parts.linear, parts.parabolic)]
    [-2.0, 5.0]
    """
    # Rows in one piece are summed in one order, so that a draw gives bit for bit what it gives alone.
    values = np.ascontiguousarray(values)
    x = 2.0 * (f_hz - f_hz[0]) / (f_hz[-1] - f_hz[0]) - 1.0
    step = np.diff(x) / 4.0
    weight = np.zeros_like(x)
    weight[:-1] += step
    weight[1:] += step
    # Polynomials orthogonal under these weights (Gram-Schmidt), so that each sum stands alone.
    centre = float((weight * x).sum())
    p1 = x - centre
    n1 = float((weight * p1 * p1).sum())
    mean = (values * weight).sum(-1)
    first = (values * (weight * p1 / n1)).sum(-1)
    rest = values - mean[..., np.newaxis] - first[..., np.newaxis] * p1
    if degree == 1:
        return Fit(mean, first, np.zeros_like(first), rest)
    p2 = p1 * p1 - n1
    skew = float((weight * p2 * p1).sum()) / n1
    p2 -= skew * p1
    n2 = float((weight * p2 * p2).sum())
    # Two samples draw no parabola: what cannot be told is nan, never nothing.
    second = (values * (weight * p2 / n2)).sum(-1) if n2 > 1e-9 else np.full_like(first, np.nan)
    rest = rest - second[..., np.newaxis] * p2
    return Fit(mean, first - second * (2.0 * centre + skew), second, rest)
