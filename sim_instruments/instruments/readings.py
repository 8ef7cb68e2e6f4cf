"""What stands behind the front of a network analyzer: physics, or a recording."""

from __future__ import annotations

from typing import Protocol

from sim_instruments.waves import Matrix, Real

__all__ = ["Readings"]


class Readings(Protocol):
    """Where an analyzer's readings come from."""

    def read(
        self, f_hz: Real, bandwidth_hz: float, power_dbm: float | Real, averages: int, source_on: bool
    ) -> Matrix:
        """Raw readings ``(f, 2, 2)`` of what is connected now.

        Parameters
        ----------
        f_hz
            ``(f,)``.
        bandwidth_hz
            Of the IF filter.
        power_dbm
            Of the source, one or ``(f,)``.
        averages
            Sweeps averaged.
        source_on
            Whether it sends.

        Raises
        ------
        ScpiError
            If it cannot be read.
        """
        ...

    def switch_terms(self, f_hz: Real) -> Matrix:
        """What the idle port reflects, with port 1 and with port 2 driven, ``(f, 2)``.

        Raises
        ------
        ScpiError
            -241 where nothing reads it.
        """
        ...

    def is_cold(self) -> bool:
        """Whether readings still move because it was switched on not long ago."""
        ...
