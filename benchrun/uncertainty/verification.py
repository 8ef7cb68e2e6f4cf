"""Is the calibration good? A verification part measured against its known values.

Source: ISO/IEC 17043:2010, B.3.1.3 e (E_n numbers; from memory), carried over to complex quantities as a
distance in the metric of their covariance, where ``|E_n| <= 1`` holds with the coverage of the stated factor.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["Verification", "en_complex", "en_number", "verify"]

FACTOR_2D = 2.4477
"""Radius that holds 95 % of a normal distribution in the plane: ``sqrt(-2 ln 0.05)``."""


def en_number(
    measured: FloatArray, known: FloatArray, u_measured: FloatArray, u_known: FloatArray
) -> FloatArray:
    """``E_n = (x - X) / sqrt(U_x^2 + U_X^2)`` of real values with their expanded uncertainties.

    Parameters
    ----------
    measured, known
        Any shape, the same unit.
    u_measured, u_known
        Expanded uncertainties of the same coverage.

    Examples
    --------
    >>> float(en_number(np.array(10.06), np.array(10.0), np.array(0.04), np.array(0.03)).round(6))
    1.2
    """
    return np.asarray((measured - known) / np.hypot(u_measured, u_known))


def en_complex(
    measured: ComplexArray, known: ComplexArray, covariance: FloatArray, covariance_known: FloatArray
) -> FloatArray:
    """Distance of complex values over the radius that 95 % of such distances stay within.

    Parameters
    ----------
    measured, known
        ``(f,)``, linear.
    covariance, covariance_known
        Of real and imaginary part, ``(f, 2, 2)``.

    Returns
    -------
    numpy.ndarray
        ``(f,)``, not negative; at most 1 is in order.
    """
    off = np.stack([(measured - known).real, (measured - known).imag], axis=-1)
    total = covariance + covariance_known
    distance = np.einsum("fi,fi->f", off, np.linalg.solve(total, off[..., np.newaxis])[..., 0])
    return np.asarray(np.sqrt(np.maximum(distance, 0.0)) / FACTOR_2D)


@dataclass(frozen=True, slots=True)
class Verification:
    """What a verification comes to.

    Parameters
    ----------
    worst
        Greatest ``|E_n|``.
    at_hz
        Where.
    outside
        Share of the points beyond 1.
    passed
        Whether the calibration may serve.
    """

    worst: float
    at_hz: float
    outside: float
    passed: bool


def verify(f_hz: FloatArray, en: FloatArray, allowed: float = 1.0, share: float = 0.05) -> Verification:
    """Judge a verification.

    Points of one sweep hang together, so one that is beyond 1 does not stand alone; but 95 % intervals are
    meant to be left by one point in twenty. So a share of the points may lie beyond, none of them by half.

    Parameters
    ----------
    f_hz, en
        ``(f,)``.
    allowed
        Greatest ``|E_n|`` that is in order.
    share
        Of points that may lie beyond it, up to one and a half times as far.

    Raises
    ------
    ValueError
        If a value is not a number, or there is none.
    """
    size = np.abs(en)
    if len(size) == 0 or not np.all(np.isfinite(size)):
        raise ValueError("E_n numbers are missing or not numbers: values or uncertainties are not known")
    index, outside = int(np.argmax(size)), float(np.mean(size > allowed))
    passed = outside <= share and float(size[index]) <= 1.5 * allowed
    return Verification(float(size[index]), float(f_hz[index]), outside, passed)
