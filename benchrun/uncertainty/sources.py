"""Declared sources of uncertainty of a bench: what makes readings differ, before any calibration.

Where residual terms say what is left after correction, sources say what happens at each reading: noise,
drift, bending cables, connections, leakage, a fixture that is not quite its file. What that comes to after
the calibration and de-embedding actually done is then propagated, not declared (JCGM 101:2008; the list of
influences follows EURAMET cg-12 version 3, from memory).

A systematic influence is one draw per run along the whole sweep, noise one per point, a connection one for
each time it is made.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, fields

from benchrun.quantity import Dimension, QuantityError, parse
from benchrun.uncertainty.distribution import Distribution

__all__ = ["GROUPS", "UNDECLARED", "Sources"]


def _below_one(text: str) -> float:
    return float(10.0 ** (-abs(parse(text, Dimension.RATIO)) / 20.0))


def _ripple(text: str) -> float:
    return float(10.0 ** (abs(parse(text, Dimension.RATIO)) / 20.0) - 1.0)


def _as(dimension: Dimension) -> Callable[[str], float]:
    return lambda text: parse(text, dimension)


def _radians(text: str) -> float:
    return math.radians(parse(text, Dimension.ANGLE))


GROUPS: Mapping[str, Mapping[str, Callable[[str], float]]] = {
    "noise": {"floor": _as(Dimension.POWER), "trace": _ripple},
    "linearity": {"deviation": _ripple},
    "drift": {
        "per hour": _ripple,
        "per kelvin": _ripple,
        "delay per kelvin": _as(Dimension.TIME),
        "over": _as(Dimension.TIME),
        "room": _as(Dimension.TEMPERATURE),
    },
    "cable": {"reflection": _below_one, "magnitude": _ripple, "phase": _radians},
    "connector": {"repeatability": _below_one, "floor": _below_one},
    "isolation": {"leakage": _below_one},
    "fixture": {
        "delay": _as(Dimension.TIME),
        "impedance": _as(Dimension.IMPEDANCE),
        "loss": _ripple,
        "launch": _as(Dimension.CAPACITANCE),
    },
}
"""What a bench file may say under ``sources``, and how each value is read."""

_DEFAULT = {
    "linearity": Distribution.RECTANGULAR,
    "isolation": Distribution.U_SHAPED,
}


@dataclass(frozen=True, slots=True)
class Sources:
    """Sizes of the sources, linear and in SI.

    What each size means depends on its distribution, see :meth:`Distribution.standard`.

    Parameters
    ----------
    noise_floor_dbm
        Receiver noise in 1 Hz; None where none is declared.
    noise_trace
        Relative, root mean square, in 1 kHz: noise in proportion to the reading.
    linearity_deviation
        Relative, of each reading, one draw for its whole sweep.
    drift_per_hour, drift_per_kelvin
        Relative change of what a port's receivers read, a vector.
    drift_delay_per_kelvin
        Of each test cable, seconds.
    drift_over, drift_room
        Seconds between calibrating and measuring; standard deviation of the room's temperature in that time.
    cable_reflection, cable_magnitude, cable_phase
        What bending a test cable for one connection does: a reflection (vector), a relative change of what
        passes once, an angle in rad at 1 GHz that grows with frequency.
    connector_repeatability, connector_floor
        Reflection of one connection: at 1 GHz, growing with frequency, and the same at all frequencies.
    isolation_leakage
        Reaches the other port around the unit.
    fixture_delay, fixture_impedance, fixture_loss, fixture_launch
        How far a fixture half is from its file: seconds, ohm, relative at 1 GHz (grows with its root), farad
        across the unit's side.
    distribution
        By group; normal where nothing is said (linearity: rectangular; isolation: U-shaped).

    Examples
    --------
    >>> sources = Sources.from_mapping({"connector": {"repeatability": "68 dB"}})
    >>> round(sources.connector_repeatability, 6)
    0.000398
    """

    noise_floor_dbm: float | None = None
    noise_trace: float = 0.0
    linearity_deviation: float = 0.0
    drift_per_hour: float = 0.0
    drift_per_kelvin: float = 0.0
    drift_delay_per_kelvin: float = 0.0
    drift_over: float = 1800.0
    drift_room: float = 0.5
    cable_reflection: float = 0.0
    cable_magnitude: float = 0.0
    cable_phase: float = 0.0
    connector_repeatability: float = 0.0
    connector_floor: float = 0.0
    isolation_leakage: float = 0.0
    fixture_delay: float = 0.0
    fixture_impedance: float = 0.0
    fixture_loss: float = 0.0
    fixture_launch: float = 0.0
    distribution: Mapping[str, Distribution] = field(default_factory=dict)

    @classmethod
    def from_mapping(cls, declared: Mapping[str, Mapping[str, str]]) -> Sources:
        """From text with units, as a bench file declares it.

        Raises
        ------
        QuantityError
            For an unknown source, key or distribution, or a value in another unit.
        """
        values: dict[str, float] = {}
        shapes: dict[str, Distribution] = {}
        for group, entries in declared.items():
            if group not in GROUPS:
                raise QuantityError(f"{group!r} is no source; known are {', '.join(GROUPS)}")
            for key, text in entries.items():
                if key == "distribution":
                    shapes[group] = _shape(group, text)
                elif key in GROUPS[group]:
                    name = f"{group}_{key.replace(' ', '_')}"
                    name = "noise_floor_dbm" if name == "noise_floor" else name
                    values[name] = GROUPS[group][key](text)
                else:
                    known = ", ".join((*GROUPS[group], "distribution"))
                    raise QuantityError(f"{group} does not know {key!r}; it takes {known}")
        return cls(**values, distribution=shapes)

    @property
    def declared(self) -> bool:
        """Whether anything is declared at all."""
        passive = ("distribution", "drift_over", "drift_room")
        default = Sources()
        return any(
            getattr(self, f.name) != getattr(default, f.name) for f in fields(self) if f.name not in passive
        )

    def shape(self, group: str) -> Distribution:
        """Distribution of a group."""
        return self.distribution.get(group, _DEFAULT.get(group, Distribution.NORMAL))

    @property
    def drift(self) -> float:
        """Relative drift of one reading against another: over time and with the room, root sum of squares."""
        over_time = self.drift_per_hour * self.drift_over / 3600.0
        return math.hypot(over_time, self.drift_per_kelvin * self.drift_room)

    def noise(self, bandwidth_hz: float, power_dbm: float, averages: int) -> tuple[float, float]:
        """Noise of one reading, root mean square of the complex number.

        Parameters
        ----------
        bandwidth_hz, power_dbm, averages
            As the sweep was set.

        Returns
        -------
        floor, trace
            Linear against the source, and relative to the reading.

        Examples
        --------
        >>> floor, _ = Sources(noise_floor_dbm=-150.0).noise(1e3, -10.0, 1)
        >>> round(20 * math.log10(floor))
        -110
        """
        floor = 0.0
        if self.noise_floor_dbm is not None:
            floor = 10.0 ** ((self.noise_floor_dbm + 10.0 * math.log10(bandwidth_hz) - power_dbm) / 20.0)
        root = math.sqrt(1.0 / averages)
        return floor * root, self.noise_trace * math.sqrt(bandwidth_hz / 1e3) * root


def _shape(group: str, text: str) -> Distribution:
    try:
        return Distribution(text)
    except ValueError:
        known = ", ".join(d.value for d in Distribution)
        raise QuantityError(f"{group}: {text!r} is no distribution; known are {known}") from None


UNDECLARED = Sources()
"""No source at all."""
