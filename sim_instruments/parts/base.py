"""What every simulated part offers."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from sim_instruments.waves import Matrix, Real

__all__ = ["Part", "Surroundings"]


@dataclass(frozen=True)
class Surroundings:
    """What a part feels of the room."""

    temperature_c: float = 23.0


@dataclass(frozen=True)
class Part:
    """A part.

    Parameters
    ----------
    ports
        1 or 2.
    response
        ``(f_hz, surroundings) -> (f, n, n)``: its true S-parameters.
    says
        What is known of it, in words.
    """

    ports: int
    response: Callable[[Real, Surroundings], Matrix]
    says: str = ""

    def matrix(self, f_hz: Real, around: Surroundings | None = None) -> Matrix:
        """True S-parameters ``(f, n, n)``, linear."""
        return self.response(f_hz, around or Surroundings())
