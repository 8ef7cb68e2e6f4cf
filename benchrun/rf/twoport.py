r"""Two-port scattering parameters as four planes, for one sweep or for many draws of it.

All algebra of the project stands on this one class. A plane is a complex array of shape ``(..., f)``:
``(f,)`` for one sweep, ``(d, f)`` for *d* Monte Carlo draws of it; leading axes broadcast. Cascades and
their inverses are written in the S-domain, never through transfer matrices, because those lose
``eps/|S21|`` where transmission is small.

The same real reference impedance is meant at every plane; see :mod:`benchrun.rf` for renormalisation.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

__all__ = ["ComplexArray", "FloatArray", "TwoPort"]

ComplexArray: TypeAlias = NDArray[np.complex128]
"""Linear, dimensionless wave ratios; shape ``(..., f)`` unless said otherwise."""
FloatArray: TypeAlias = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class TwoPort:
    """Scattering parameters of a two-port.

    Parameters
    ----------
    s11, s12, s21, s22
        Linear complex planes of shape ``(..., f)``; ``s21`` is transmission from port 1 to port 2.

    Examples
    --------
    >>> import numpy as np
    >>> pad = TwoPort.of(np.array([[[0.0, 0.5], [0.5, 0.0]]]))
    >>> twice = pad @ pad
    >>> float(abs(twice.s21[0]))
    0.25
    >>> float(abs(twice.without_left(pad).s21[0]))
    0.5
    """

    s11: ComplexArray
    s12: ComplexArray
    s21: ComplexArray
    s22: ComplexArray

    @classmethod
    def of(cls, matrix: NDArray[np.complexfloating] | NDArray[np.floating]) -> TwoPort:
        """From an array of shape ``(..., f, 2, 2)``, row index = outgoing port.

        Raises
        ------
        ValueError
            If the last two axes are not 2 by 2.
        """
        if matrix.ndim < 3 or matrix.shape[-2:] != (2, 2):
            raise ValueError(f"expected shape (..., f, 2, 2), got {matrix.shape}")
        m = np.asarray(matrix, dtype=np.complex128)
        return cls(
            np.ascontiguousarray(m[..., 0, 0]),
            np.ascontiguousarray(m[..., 0, 1]),
            np.ascontiguousarray(m[..., 1, 0]),
            np.ascontiguousarray(m[..., 1, 1]),
        )

    @classmethod
    def through(cls, points: int) -> TwoPort:
        """Make a zero-length, lossless thru of ``points`` frequencies."""
        zero, one = np.zeros(points, np.complex128), np.ones(points, np.complex128)
        return cls(zero, one, one, zero)

    @property
    def matrix(self) -> ComplexArray:
        """Shape ``(..., f, 2, 2)``."""
        s11, s12, s21, s22 = np.broadcast_arrays(*self.planes)
        return np.stack([np.stack([s11, s12], -1), np.stack([s21, s22], -1)], -2)

    @property
    def planes(self) -> tuple[ComplexArray, ComplexArray, ComplexArray, ComplexArray]:
        """``(s11, s12, s21, s22)``."""
        return self.s11, self.s12, self.s21, self.s22

    @property
    def determinant(self) -> ComplexArray:
        """``s11 s22 - s12 s21``."""
        return self.s11 * self.s22 - self.s12 * self.s21

    def parameter(self, name: str) -> ComplexArray:
        """One plane by its trade name, ``"S11"`` to ``"S22"``.

        Raises
        ------
        KeyError
            For any other name.
        """
        return {"S11": self.s11, "S12": self.s12, "S21": self.s21, "S22": self.s22}[name]

    def map(self, function: Callable[[ComplexArray], ComplexArray]) -> TwoPort:
        """Apply one function to each plane."""
        return TwoPort(*(function(p) for p in self.planes))

    def flipped(self) -> TwoPort:
        """Turn the part round: ports 1 and 2 exchanged."""
        return TwoPort(self.s22, self.s21, self.s12, self.s11)

    def __matmul__(self, right: TwoPort) -> TwoPort:
        """Cascade: port 2 of ``self`` joined to port 1 of ``right`` (star product)."""
        a, b = self, right
        d = 1.0 / (1.0 - a.s22 * b.s11)
        return TwoPort(
            a.s11 + a.s12 * b.s11 * a.s21 * d,
            a.s12 * b.s12 * d,
            b.s21 * a.s21 * d,
            b.s22 + b.s21 * a.s22 * b.s12 * d,
        )

    def terminated(self, gamma: ComplexArray) -> ComplexArray:
        """Reflection at port 1 with a reflection ``gamma`` on port 2."""
        return self.s11 + self.s12 * self.s21 * gamma / (1.0 - self.s22 * gamma)

    def without_left(self, left: TwoPort) -> TwoPort:
        """Take away ``left``, which stood before port 1.

        Solved in the S-domain from the star product ``self = left @ rest``; needs transmission both ways
        in ``left`` only, so a rest with no transmission at all is exact.
        """
        a, m = left, self
        # The half is one plane, the reading may be many: what can be divided is divided in the half, and only
        # one division is made in the reading's shape.
        out, back = 1.0 / a.s21, 1.0 / a.s12
        u = (m.s11 - a.s11) * (out * back)
        inverse = 1.0 / (1.0 + a.s22 * u)
        s21 = m.s21 * inverse * out
        s12 = m.s12 * inverse * back
        s22 = m.s22 - m.s12 * s21 * (a.s22 * back)
        return TwoPort(u * inverse, s12, s21, s22)

    def without_right(self, right: TwoPort) -> TwoPort:
        """Take away ``right``, which stood behind port 2."""
        return self.flipped().without_left(right.flipped()).flipped()
