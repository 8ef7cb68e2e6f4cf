"""S-parameters between the points of a file."""

from __future__ import annotations

import numpy as np

from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["resample", "resampling_error"]


def resample(f_hz: FloatArray, plane: ComplexArray, wanted_hz: FloatArray, order: int = 3) -> ComplexArray:
    """Values at other frequencies, by a polynomial through the nearest points of the complex plane.

    Real and imaginary parts are interpolated, since a magnitude has a kink where it passes zero. Four
    points (``order`` 3) leave an error of the fourth order of the step.

    Parameters
    ----------
    f_hz
        ``(k,)``, increasing, at least two.
    plane
        ``(..., k)``.
    wanted_hz
        ``(f,)``, inside ``f_hz``.
    order
        Degree of the polynomial; fewer points lower it.

    Returns
    -------
    numpy.ndarray
        ``(..., f)``.

    Examples
    --------
    >>> import numpy as np
    >>> x = np.array([0.0, 1.0, 2.0, 3.0])
    >>> complex(resample(x, (x**3).astype(complex), np.array([1.5]))[0])
    (3.375+0j)
    """
    count = min(order + 1, len(f_hz))
    right = np.clip(np.searchsorted(f_hz, wanted_hz), 1, len(f_hz) - 1)
    first = np.clip(right - count // 2, 0, len(f_hz) - count)
    nodes = first[:, np.newaxis] + np.arange(count)
    x = f_hz[nodes]
    result = np.zeros((*plane.shape[:-1], len(wanted_hz)), np.complex128)
    for j in range(count):
        others = [m for m in range(count) if m != j]
        weight = np.prod([(wanted_hz - x[:, m]) / (x[:, j] - x[:, m]) for m in others], axis=0)
        result += plane[..., nodes[:, j]] * weight
    return result


def resampling_error(f_hz: FloatArray, plane: ComplexArray, wanted_hz: FloatArray) -> float:
    """Estimate of the greatest error of :func:`resample`: its difference to one order less, linear."""
    difference = resample(f_hz, plane, wanted_hz) - resample(f_hz, plane, wanted_hz, order=2)
    return float(np.max(np.abs(difference)))
