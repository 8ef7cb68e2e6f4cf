"""Reference planes moved along a matched line, by delay and loss."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["Extension", "move_planes", "move_reflection"]


@dataclass(frozen=True, slots=True)
class Extension:
    """The stretch of matched line by which a plane is moved towards the unit.

    Parameters
    ----------
    delay_s
        One way; negative moves the plane away from the unit.
    loss_db
        One way, positive, at ``at_hz``; grows with the square root of frequency (skin effect).
    at_hz
        Where ``loss_db`` holds.
    dc_loss_db
        One way, the same at every frequency.
    """

    delay_s: float = 0.0
    loss_db: float = 0.0
    at_hz: float = 1e9
    dc_loss_db: float = 0.0

    def transmission(self, f_hz: FloatArray) -> ComplexArray:
        """Of the stretch, ``(f,)``, linear.

        Examples
        --------
        >>> import numpy as np
        >>> e = Extension(0.25e-9).transmission(np.array([1e9]))
        >>> round(float(np.degrees(np.angle(e[0]))), 9)
        -90.0
        """
        loss_db = self.dc_loss_db + self.loss_db * np.sqrt(f_hz / self.at_hz)
        return np.asarray(10.0 ** (-loss_db / 20.0) * np.exp(-2j * np.pi * f_hz * self.delay_s))


def move_planes(
    f_hz: FloatArray, two: TwoPort, one: Extension | None = None, other: Extension | None = None
) -> TwoPort:
    """Move the plane of port 1 by ``one`` and that of port 2 by ``other`` towards the unit.

    The line is taken as matched to the reference impedance: reflections change by the way forth and back,
    transmissions by the way once.
    """
    e1 = 1.0 if one is None else 1.0 / one.transmission(f_hz)
    e2 = 1.0 if other is None else 1.0 / other.transmission(f_hz)
    both = e1 * e2
    return TwoPort(two.s11 * e1**2, two.s12 * both, two.s21 * both, two.s22 * e2**2)


def move_reflection(f_hz: FloatArray, s: ComplexArray, by: Extension) -> ComplexArray:
    """As :func:`move_planes`, for a one-port."""
    return np.asarray(s / by.transmission(f_hz) ** 2)
