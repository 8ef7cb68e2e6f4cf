"""What every simulated part offers."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from typing import Any

from sim_instruments.waves import Matrix, Real

__all__ = ["Part", "Stage", "Surroundings", "known_keys", "unknown_fault"]


@dataclass(frozen=True)
class Surroundings:
    """What a part feels of the room.

    Parameters
    ----------
    temperature_c
        Of the room.
    bend
        How far cables were moved since they were laid: 0 not at all, 1 a usual bend either way.
    supply_v
        What an active part is fed with; none given: its rated voltage.
    """

    temperature_c: float = 23.0
    bend: float = 0.0
    supply_v: float | None = None


@dataclass(frozen=True)
class Stage:
    """What an active part is beyond its S-parameters; levels are at its output, in dBm.

    Parameters
    ----------
    gain_db
        Small-signal, at its rated supply.
    p1db_dbm
        Output level at which gain is down by 1 dB.
    ip3_dbm
        Third-order intercept.
    noise_figure_db
        At 290 K.
    supply_v, supply_a
        Rated voltage and current.
    """

    gain_db: float
    p1db_dbm: float
    ip3_dbm: float
    noise_figure_db: float
    supply_v: float
    supply_a: float

    def third_order_dbm(self, out_dbm: float) -> float:
        """Level of each third-order product of two equal tones: ``3 P - 2 IP3`` (Pozar 10.3, from memory)."""
        return 3.0 * out_dbm - 2.0 * self.ip3_dbm

    def noise_dbm_hz(self) -> float:
        """Noise density at the output: ``kT0 + NF + G``, kT0 = -173.975 dBm/Hz."""
        return -173.975 + self.noise_figure_db + self.gain_db

    def current_a(self, supply_v: float) -> float:
        """Supply current: in proportion below half the rated voltage, flat and slightly rising above."""
        share = supply_v / self.supply_v
        return self.supply_a * (0.9 * min(2.0 * share, 1.0) + 0.1 * share)


@dataclass(frozen=True)
class Part:
    """A part.

    Parameters
    ----------
    ports
        1 or 2.
    response
        ``(f_hz, surroundings) -> (f, n, n)``: its true S-parameters at low level.
    says
        What is known of it, in words.
    kind
        One of :data:`sim_instruments.parts.KINDS`.
    gain_factor
        ``(f_hz, surroundings, incident_dbm) -> (f,)``: what its S21 is multiplied by when a wave of that
        level meets its port 1; none: a linear part.
    stage
        Of an active part.
    """

    ports: int
    response: Callable[[Real, Surroundings], Matrix]
    says: str = ""
    kind: str = ""
    gain_factor: Callable[[Real, Surroundings, Real], Real] | None = None
    stage: Stage | None = None

    def matrix(self, f_hz: Real, around: Surroundings | None = None) -> Matrix:
        """True S-parameters ``(f, n, n)``, linear, at low level."""
        return self.response(f_hz, around or Surroundings())

    def driven(self, f_hz: Real, around: Surroundings, incident_dbm: Real) -> Matrix:
        """True S-parameters ``(f, n, n)`` under a wave of a level, ``(f,)`` in dBm, at port 1."""
        m = self.response(f_hz, around)
        if self.gain_factor is None:
            return m
        m = m.copy()
        m[:, 1, 0] *= self.gain_factor(f_hz, around, incident_dbm)
        return m


def known_keys(spec: Mapping[str, Any], *keys: str) -> None:
    """Refuse what a description should not hold: a slip of the pen would pass for a default.

    Raises
    ------
    ValueError
        With the key and the known ones.
    """
    for key in spec:
        if key not in (*keys, "kind", "faults"):
            raise ValueError(f"does not know {key!r}; known are {', '.join(keys)}")


def unknown_fault(fault: str, known: Iterable[str]) -> ValueError:
    """The error for a fault that a part cannot have."""
    return ValueError(f"fault {fault!r} makes no sense here; known are {', '.join(known)}")
