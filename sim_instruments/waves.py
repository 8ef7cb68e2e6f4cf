"""Scattering matrices of the simulated world: arrays ``(f, n, n)``, row = outgoing port, one real reference.

Chains are joined in the S-domain, which is exact however little is transmitted; ladders are summed as
chain (ABCD) matrices and converted once.
"""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "Matrix", "Plane", "Real", "both", "chain", "empty", "flip", "from_abcd", "join", "line", "seen_through",
    "thru", "two",
]  # fmt: skip

Matrix: TypeAlias = NDArray[np.complex128]
"""``(f, n, n)``, linear."""
Plane: TypeAlias = NDArray[np.complex128]
"""``(f,)``, linear."""
Real: TypeAlias = NDArray[np.float64]


def empty(points: int) -> Matrix:
    """Room for a matrix, each plane in one piece of memory: everything here works plane by plane."""
    return np.empty((2, 2, points), np.complex128).transpose(2, 0, 1)


def two(s11: Plane, s12: Plane, s21: Plane, s22: Plane) -> Matrix:
    """Four planes as one matrix."""
    m = empty(len(s11))
    m[:, 0, 0], m[:, 0, 1], m[:, 1, 0], m[:, 1, 1] = s11, s12, s21, s22
    return m


def thru(points: int) -> Matrix:
    """Nothing at all between two ports."""
    m = empty(points)
    m[:, 0, 0] = m[:, 1, 1] = 0.0
    m[:, 0, 1] = m[:, 1, 0] = 1.0
    return m


def flip(a: Matrix) -> Matrix:
    """Turned round."""
    return a[:, ::-1, ::-1]


def both(left: Plane, right: Plane) -> Matrix:
    """Two reflections that do not know of each other."""
    m = empty(len(left))
    m[:, 0, 1] = m[:, 1, 0] = 0.0
    m[:, 0, 0], m[:, 1, 1] = left, right
    return m


def join(a: Matrix, b: Matrix) -> Matrix:
    """Port 2 of ``a`` on port 1 of ``b``.

    The wave between them runs to and fro; its geometric series sums to ``1 / (1 - a22 b11)``.
    """
    rounds = 1.0 / (1.0 - a[:, 1, 1] * b[:, 0, 0])
    right = a[:, 1, 0] * rounds
    left = b[:, 0, 1] * rounds
    return two(
        a[:, 0, 0] + a[:, 0, 1] * b[:, 0, 0] * right,
        a[:, 0, 1] * left,
        b[:, 1, 0] * right,
        b[:, 1, 1] + b[:, 1, 0] * a[:, 1, 1] * left,
    )


def chain(*parts: Matrix) -> Matrix:
    """All in a row."""
    result = parts[0]
    for part in parts[1:]:
        result = join(result, part)
    return result


def seen_through(a: Matrix, gamma: Plane) -> Plane:
    """What port 1 of ``a`` shows when port 2 ends in ``gamma``."""
    return np.asarray(a[:, 0, 0] + a[:, 0, 1] * gamma * a[:, 1, 0] / (1.0 - a[:, 1, 1] * gamma))


def from_abcd(a: Plane, b: Plane, c: Plane, d: Plane, z0: float = 50.0) -> Matrix:
    """A reciprocal two-port from its chain matrix (AD - BC = 1).

    Pozar, Microwave Engineering, table 4.2 (from memory).
    """
    total = a + b / z0 + c * z0 + d
    across = np.asarray(2.0 / total)
    return two((a + b / z0 - c * z0 - d) / total, across, across, (-a + b / z0 - c * z0 + d) / total)


def line(
    f_hz: Real,
    delay_s: float,
    z_ohm: float | Plane,
    loss_db: float = 0.0,
    at_hz: float = 1e9,
    z0: float = 50.0,
) -> Matrix:
    """A line by its chain matrix.

    Parameters
    ----------
    f_hz
        ``(f,)``.
    delay_s
        One way.
    z_ohm
        Characteristic impedance.
    loss_db
        At ``at_hz``; grows with the root of frequency (skin effect).
    """
    gamma = loss_db / 8.685889638 * np.sqrt(f_hz / at_hz) + 2j * np.pi * f_hz * delay_s
    there = np.exp(-gamma)
    back = 1.0 / there
    cosh, sinh = 0.5 * (back + there), 0.5 * (back - there)
    step, mean = (z_ohm / z0 - z0 / z_ohm) * sinh, (z_ohm / z0 + z0 / z_ohm) * sinh
    total = 2.0 * cosh + mean
    reflected = np.asarray(step / total, np.complex128)
    across = np.asarray(2.0 / total, np.complex128)
    return two(reflected, across, across, reflected)
