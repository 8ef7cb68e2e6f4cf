"""Which way round a fixture half is, where the data can tell.

Before the wave has been to the end of the half and back, a reading shows the half's own reflections and
nothing of the unit. So the early part of the reading's impulse response equals that of the half's outer
port; if it equals that of the inner port instead, the file is the wrong way round. A half that is the same
from both sides cannot tell, and need not; a half too short for the span cannot either.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.rf.interpolation import resample
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["Facing", "facing", "refuse_turned"]

_CELLS = 3.0
"""Resolution cells (1 / span) that must fit into the round trip of the half."""

_FINER = 4
"""Samples of the response in one resolution cell."""

_SURE = 2.0
"""How many times better one way must fit than the other."""


@dataclass(frozen=True, slots=True)
class Facing:
    """How well a half fits the early part of a reading, each way round.

    Parameters
    ----------
    as_given, turned
        Root-mean-square of what is left of the early impulse response, relative to the half's own.
    cells
        Resolution cells in the round trip of the half.
    """

    as_given: float
    turned: float
    cells: float

    @property
    def right_way(self) -> bool | None:
        """Whether the half is the right way round; None if the data cannot tell."""
        if self.cells < _CELLS or max(self.as_given, self.turned) < 1e-9:
            return None
        if self.turned > _SURE * self.as_given:
            return True
        if self.as_given > _SURE * self.turned:
            return False
        return None


def facing(f_hz: FloatArray, seen: ComplexArray, half: TwoPort) -> Facing:
    """Compare the reflection seen at a port with a half, both ways round.

    Parameters
    ----------
    f_hz
        ``(f,)``, increasing.
    seen
        Corrected reflection at the outer port of fixture and unit, ``(f,)``.
    half
        ``(f,)``, with port 1 outside as the file claims.
    """
    grid = np.linspace(f_hz[0], f_hz[-1], len(f_hz))
    step = grid[1] - grid[0]
    window = np.hanning(len(grid) + 2)[1:-1]

    def early(plane: ComplexArray, count: int) -> ComplexArray:
        response = np.fft.ifft(resample(f_hz, plane, grid) * window, _FINER * len(grid))
        return np.asarray(np.concatenate([response[-2 * _FINER :], response[:count]]))

    delay = _delay(f_hz, half.s21)
    cells = 2.0 * delay * (grid[-1] - grid[0])
    # The round trip less one and a half cells: what the window smears from the unit stays out.
    count = round(max(2.0 * delay - 1.5 / (grid[-1] - grid[0]), 0.0) * _FINER * len(grid) * step)
    count = min(max(count, 1), 2 * len(grid))
    read, one, two = (early(p, count) for p in (seen, half.s11, half.s22))
    size = float(np.sqrt(np.mean(np.abs(one) ** 2 + np.abs(two) ** 2) / 2.0)) or 1e-300
    given, turned = (float(np.sqrt(np.mean(np.abs(read - p) ** 2))) / size for p in (one, two))
    return Facing(given, turned, cells)


def _delay(f_hz: FloatArray, s21: ComplexArray) -> float:
    phase = np.unwrap(np.angle(s21))
    return max(float(-np.polyfit(f_hz, phase, 1)[0] / (2.0 * np.pi)), 0.0)


def refuse_turned(f_hz: FloatArray, reading: TwoPort, half: TwoPort, side: str, name: str) -> None:
    """Refuse a half that is the wrong way round, where the reading shows it.

    Parameters
    ----------
    reading
        Corrected reading of fixture and unit, ``(f,)``.
    half
        As it is about to be taken out: a left half with port 1 outside, a right half with port 2 outside.
    side
        ``"left"`` or ``"right"``.
    name
        File or fixture, for the message.

    Raises
    ------
    InvalidMeasurement
        If the half turned round fits the reading better by a factor of two.
    """
    seen, outward = (reading.s11, half) if side == "left" else (reading.s22, half.flipped())
    found = facing(f_hz, seen, outward)
    if found.right_way is False:
        raise InvalidMeasurement(
            f"{name} is the wrong way round: turned, its reflections fit the reading on the {side} "
            f"{found.as_given / max(found.turned, 1e-12):.1f} times better.",
            f"Exchange ports 1 and 2 of {name}; a {side} half has its port "
            f"{2 if side == 'left' else 1} at the unit.",
        )
