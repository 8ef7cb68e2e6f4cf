"""What sets analyzers of one kind apart: limits, and manners where standards leave a choice."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from sim_instruments.scpi.errors import ScpiError
from sim_instruments.values import number

__all__ = ["Limits", "Manners"]


def _range(spec: Mapping[str, Any], key: str, default: tuple[float, float]) -> tuple[float, float]:
    if key not in spec:
        return default
    low, high = (number(value) for value in spec[key])
    if not low < high:
        raise ValueError(f"limits of {key}: {spec[key]} is no range; write the lower end first")
    return low, high


def _known(what: str, spec: Mapping[str, Any], keys: tuple[str, ...]) -> None:
    for key in spec:
        if key not in keys:
            raise ValueError(f"{what} has no {key!r}; known are {', '.join(keys)}")


@dataclass(frozen=True)
class Limits:
    """Ranges of the settings.

    Parameters
    ----------
    frequency, power, bandwidth
        Lowest and highest, in Hz, dBm and Hz.
    points
        The most of one sweep.
    """

    frequency: tuple[float, float] = (9e3, 20e9)
    points: int = 100_001
    power: tuple[float, float] = (-60.0, 15.0)
    bandwidth: tuple[float, float] = (1.0, 1e6)

    @classmethod
    def read(cls, spec: Mapping[str, Any]) -> Limits:
        """From ``{frequency: [300 kHz, 6 GHz], points: 20001, power: [...]}`` and so on, all optional.

        Raises
        ------
        ValueError
            If it makes no sense.
        """
        _known("limits", spec, ("frequency", "points", "power", "bandwidth"))
        points = int(spec.get("points", cls.points))
        if points < 2:
            raise ValueError(f"limits of points: {points}; a sweep has two at least")
        return cls(
            _range(spec, "frequency", cls.frequency), points,
            _range(spec, "power", cls.power), _range(spec, "bandwidth", cls.bandwidth),
        )  # fmt: skip


@dataclass(frozen=True)
class Manners:
    """Choices that standards leave.

    Parameters
    ----------
    steps
        Mantissas of the IF bandwidths that there are, as ``(1, 3)`` for 1, 3, 10, 30...; none: any bandwidth.
    between_steps
        ``"nearest"`` takes the nearest step without a word, ``"refuse"`` reports -222.
    beyond_limits
        -222 is reported either way; ``"nearest"`` moves to the limit, ``"refuse"`` leaves the setting.
    while_sweeping
        A setting in mid-sweep: ``"abort"`` ends the sweep without result, ``"refuse"`` reports -221.
    """

    steps: tuple[float, ...] = ()
    between_steps: str = "nearest"
    beyond_limits: str = "refuse"
    while_sweeping: str = "abort"

    @classmethod
    def read(cls, spec: Mapping[str, Any]) -> Manners:
        """From ``{steps: [1, 3], between steps: refuse}`` and so on, all optional.

        Raises
        ------
        ValueError
            If it makes no sense.
        """
        choices = {
            "between steps": ("nearest", "refuse"),
            "beyond limits": ("refuse", "nearest"),
            "while sweeping": ("abort", "refuse"),
        }
        _known("manners", spec, ("steps", *choices))
        chosen = {}
        for key, allowed in choices.items():
            if str(value := spec.get(key, allowed[0])) not in allowed:
                raise ValueError(f"manners, {key}: {value!r}; allowed are {', '.join(allowed)}")
            chosen[key.replace(" ", "_")] = str(value)
        steps = tuple(sorted(number(step) for step in spec.get("steps", ())))
        if not all(1 <= step < 10 for step in steps):
            raise ValueError(f"manners, steps: {list(steps)}; each lies from 1 up to less than 10")
        return cls(steps, **chosen)

    def bandwidth(self, wanted_hz: float) -> float:
        """The IF bandwidth that a setting gives.

        Raises
        ------
        ScpiError
            -222 if it is no step and steps are insisted on.

        Examples
        --------
        >>> Manners(steps=(1.0, 3.0)).bandwidth(1500.0)
        1000.0
        """
        if not self.steps:
            return wanted_hz
        decade = math.floor(math.log10(wanted_hz) + 1e-9)
        near = [m * 10.0**d for d in (decade - 1, decade, decade + 1) for m in self.steps]
        best = min(near, key=lambda step: abs(math.log(step / wanted_hz)))
        if self.between_steps == "refuse" and abs(best / wanted_hz - 1) > 1e-9:
            raise ScpiError(-222, f"{wanted_hz:.9G}; next is {best:.9G}")
        return best
