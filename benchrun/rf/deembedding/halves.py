"""Fixture halves taken out of a reading, and circuits put around a result."""

from __future__ import annotations

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.rf.deembedding.quality import largest_gain
from benchrun.rf.twoport import ComplexArray, TwoPort

__all__ = ["reflection_behind", "reflection_within", "refuse_active", "within", "without"]


def without(reading: TwoPort, left: TwoPort | None = None, right: TwoPort | None = None) -> TwoPort:
    """Take fixture halves away, in the S-domain.

    Examples
    --------
    >>> import numpy as np
    >>> half = TwoPort.of(np.array([[[0.1, 0.9], [0.9, 0.05]]]))
    >>> unit = TwoPort.of(np.array([[[0.2, 1e-9], [1e-9, 0.3]]]))
    >>> back = without(within(unit, half, half.flipped()), half, half.flipped())
    >>> bool(abs(back.s21[0] - 1e-9) < 1e-22)
    True
    """
    rest = reading if left is None else reading.without_left(left)
    return rest if right is None else rest.without_right(right)


def within(unit: TwoPort, left: TwoPort | None = None, right: TwoPort | None = None) -> TwoPort:
    """Put a circuit around a unit: what it would do in there (embedding)."""
    whole = unit if left is None else left @ unit
    return whole if right is None else whole @ right


def reflection_behind(seen: ComplexArray, half: TwoPort) -> ComplexArray:
    """Reflection of a one-port at port 2 of a half, from the reflection seen at the half's port 1."""
    u = (seen - half.s11) / (half.s12 * half.s21)
    return np.asarray(u / (1.0 + half.s22 * u))


def reflection_within(unit: ComplexArray, half: TwoPort) -> ComplexArray:
    """Reflection seen at port 1 of a half with a one-port on its port 2."""
    return half.terminated(unit)


def refuse_active(half: TwoPort, name: str, slack: float = 0.02) -> None:
    """Refuse a half that gives out more power than it gets.

    Parameters
    ----------
    half
        ``(..., f)``.
    name
        For the message: file or fixture.
    slack
        Greatest gain above one, linear, that noise and a calibration may make.

    Raises
    ------
    InvalidMeasurement
        With the greatest gain.
    """
    most = float(np.max(largest_gain(half)))
    if not most <= 1.0 + slack:
        raise InvalidMeasurement(
            f"{name} gives out {most:.3f} times the wave it gets; a passive fixture half gives at most 1.",
            "Measure the half again after a fresh calibration, or see that the file holds the "
            "half's S-parameters and not something else's.",
        )
