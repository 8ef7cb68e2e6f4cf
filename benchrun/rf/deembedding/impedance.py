r"""Reference impedances changed, port by port, real or complex, in a stated kind of wave.

With complex impedances there are three kinds of wave in use, which agree while the impedance is real:

- ``power``: :math:`a = (V + zI)/(2\sqrt{\Re z})`, :math:`b = (V - z^* I)/(2\sqrt{\Re z})` (K. Kurokawa, IEEE
  Trans. MTT-13, 1965); ``|S|`` squared is power delivered and received.
- ``pseudo``: :math:`a, b = \frac{\sqrt{\Re z}}{2|z|} (V \pm zI)` (R. B. Marks and D. F. Williams, J. Res.
  NIST 97, 1992); reflections obey the line formula.
- ``travelling``: :math:`a, b = (V \pm zI)/(2\sqrt{z})`, the waves that run on a line of that impedance.

All from memory; scikit-rf's ``renormalize`` is the examiner.
"""

from __future__ import annotations

from typing import Literal, TypeAlias

import numpy as np

from benchrun.rf.twoport import ComplexArray, TwoPort

__all__ = ["Impedance", "Wave", "renormalise", "renormalise_reflection"]

Wave: TypeAlias = Literal["power", "pseudo", "travelling"]
Impedance: TypeAlias = "ComplexArray | complex"
"""One impedance in ohms, or one for each frequency ``(..., f)``."""


def renormalise(
    two: TwoPort,
    old_ohm: tuple[Impedance, Impedance],
    new_ohm: tuple[Impedance, Impedance],
    wave: Wave = "power",
) -> TwoPort:
    """Give S-parameters in other reference impedances.

    Parameters
    ----------
    two
        ``(..., f)``, in ``old_ohm`` and waves of this kind.
    old_ohm, new_ohm
        Reference impedances of port 1 and of port 2, with positive real part.
    wave
        Kind of wave before and after.

    Raises
    ------
    ValueError
        If an impedance has no positive real part.

    Examples
    --------
    >>> import numpy as np
    >>> line = TwoPort.through(1)
    >>> stepped = renormalise(line, (50, 50), (50, 75))
    >>> round(float(stepped.s11[0].real), 3), round(float(stepped.s21[0].real), 5)
    (0.2, 0.9798)
    """
    p1, q1, r1, d1 = _change(old_ohm[0], new_ohm[0], wave)
    p2, q2, r2, d2 = _change(old_ohm[1], new_ohm[1], wave)
    # b' = (R + D S) a and a' = (P + Q S) a, with diagonal P, Q, R, D.
    n11, n12, n21, n22 = r1 + d1 * two.s11, d1 * two.s12, d2 * two.s21, r2 + d2 * two.s22
    m11, m12, m21, m22 = p1 + q1 * two.s11, q1 * two.s12, q2 * two.s21, p2 + q2 * two.s22
    inverse = 1.0 / (m11 * m22 - m12 * m21)
    return TwoPort(
        (n11 * m22 - n12 * m21) * inverse,
        (n12 * m11 - n11 * m12) * inverse,
        (n21 * m22 - n22 * m21) * inverse,
        (n22 * m11 - n21 * m12) * inverse,
    )


def renormalise_reflection(
    s: ComplexArray, old_ohm: Impedance, new_ohm: Impedance, wave: Wave = "power"
) -> ComplexArray:
    """As :func:`renormalise`, for a one-port ``(..., f)``."""
    p, q, r, d = _change(old_ohm, new_ohm, wave)
    return np.asarray((r + d * s) / (p + q * s))


def _change(
    old_ohm: Impedance, new_ohm: Impedance, wave: Wave
) -> tuple[ComplexArray, ComplexArray, ComplexArray, ComplexArray]:
    """Return ``p, q, r, d`` of ``a' = p a + q b`` and ``b' = r a + d b`` at one port."""
    old, new = np.asarray(old_ohm, np.complex128), np.asarray(new_ohm, np.complex128)
    for z in (old, new):
        if not np.all(z.real > 0.0):
            raise ValueError(f"a reference impedance needs a positive real part, got {z.ravel()[0]:g} ohm")
    if wave == "power":
        # V = (a z* + b z) / sqrt(Re z), I = (a - b) / sqrt(Re z)
        size = 1.0 / (2.0 * np.sqrt(old.real * new.real))
        conjugate = np.conj(new)
        return (
            (np.conj(old) + new) * size,
            (old - new) * size,
            np.asarray(np.conj(old) - conjugate, np.complex128) * size,
            (old + conjugate) * size,
        )
    if wave == "pseudo":
        ratio = np.sqrt(new.real / old.real) * np.abs(old) / np.abs(new)
    else:
        ratio = np.sqrt(old) / np.sqrt(new)
    # V = (a + b) / k, I = (a - b) / (k z)
    plus, minus = ratio * 0.5 * (1.0 + new / old), ratio * 0.5 * (1.0 - new / old)
    return plus, minus, minus, plus
