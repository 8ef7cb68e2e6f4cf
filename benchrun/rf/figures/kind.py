"""What a figure is: a named number taken from a trace, with the parameters it needs."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any, TypeAlias

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.quantity import Dimension
from benchrun.rf.figures.band import in_band, require_inside, samples
from benchrun.rf.tone import Tone
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["FigureKind", "Found", "Parameter", "Trace"]

Trace: TypeAlias = Callable[..., FloatArray]


@dataclass(frozen=True, slots=True)
class Parameter:
    """One parameter of a figure as a sequence may write it.

    Parameters
    ----------
    form
        ``"value"``, ``"range"``, ``"port"`` or ``"choice"``.
    dimension
        Of a value or a range.
    default
        None where it must be written, unless ``optional``.
    choices
        Allowed words.
    """

    form: str
    dimension: Dimension = Dimension.NUMBER
    default: object = None
    choices: tuple[str, ...] = ()
    optional: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class Found:
    """A figure's value and where it was found; nan where a draw has none.

    Parameters
    ----------
    value
        In the figure's SI unit, ``(...,)``.
    at_hz
        Frequency of the value, ``(...,)``.
    """

    value: FloatArray
    at_hz: FloatArray


@dataclass(frozen=True, slots=True)
class FigureKind:
    """One kind of figure.

    A *trace* figure has a value at every frequency and takes its worst one over a band; a *scalar* figure
    is one number of the whole trace.

    Parameters
    ----------
    name
        As written in a sequence.
    dimension
        Of its value and its limits.
    meaning
        Exact definition in a sentence, shown to people.
    parameters
        What it needs, by name.
    ports
        1 if a reflection alone will do, else 2.
    trace
        ``(f_hz, network, **parameters) -> (..., f)`` for a trace figure.
    scalar
        ``(f_hz, network, **parameters) -> Found`` for a scalar figure.
    reach_hz
        Parameter whose half extends the band at both ends (an aperture), or empty.
    sense
        +1 if the value is ``+20 log10`` of one magnitude, -1 if it is ``-20 log10`` of one, else 0. Such a
        value's uncertainty is found in the magnitude, where it is linear, and then turned into dB.
    local
        Whether samples outside of its band (and the ones next to it) have no say in it.
    width
        Whether a figure of frequency is a distance between two, so that its limits lie nowhere in a sweep.
    domain
        ``"sweep"``: taken from S-parameters; ``"tone"``: from levels of a tone.
    sides
        Limits that make sense for it.
    between
        ``(f_hz, network, where_hz, **parameters) -> (..., k)`` in place of ``trace``, for a trace figure
        that can be taken between samples; a ``trace`` is interpolated there.
    """

    name: str
    dimension: Dimension
    meaning: str
    parameters: Mapping[str, Parameter] = field(default_factory=dict)
    ports: int = 2
    trace: Trace | None = None
    scalar: Callable[..., Found] | None = None
    reach_hz: str = ""
    sense: int = 0
    local: bool = True
    width: bool = False
    domain: str = "sweep"
    sides: tuple[str, ...] = ("at least", "at most")
    between: Trace | None = None

    def band(self, parameters: Mapping[str, Any]) -> tuple[float, float] | None:
        """Lowest and highest frequency that the figure looks at; None for the whole sweep."""
        if parameters.get("over") is not None:
            low, high = parameters["over"]
        elif parameters.get("at") is not None:
            low = high = parameters["at"]
        else:
            return None
        reach = parameters.get(self.reach_hz, 0.0) / 2.0 if self.reach_hz else 0.0
        return low - reach, high + reach

    def measure(
        self, f_hz: FloatArray, network: TwoPort | ComplexArray | Tone, side: str, **parameters: Any
    ) -> Found:
        """Take the figure.

        Parameters
        ----------
        f_hz
            ``(f,)``.
        network
            Planes ``(f,)`` or ``(d, f)``; a tone for figures of that domain.
        side
            ``"at most"`` takes the greatest value of a band, ``"at least"`` the least.
        **parameters
            In SI units, complete (defaults filled in).

        Raises
        ------
        InvalidMeasurement
            If the figure cannot be told from a nominal network. With a draw axis, such draws give nan.
        """
        band = self.band(parameters)
        if band is not None:
            require_inside(f_hz, *band, self.name)
        if parameters.get("against") is not None:
            low, high = parameters["against"]
            require_inside(f_hz, low, high, f"the reference of {self.name}")
        if self.scalar is not None:
            return self._sure(self.scalar(f_hz, network, **parameters))
        if isinstance(network, Tone):
            raise TypeError(f"{self.name} is taken from S-parameters, not from a tone")
        if parameters.get("at") is not None:
            value = self._values(f_hz, network, (parameters["at"],) * 2, parameters)[1][..., 0]
            return self._sure(Found(value, np.full(value.shape, parameters["at"])))
        f, v = self._values(f_hz, network, parameters["over"], parameters)
        index = np.argmax(v, -1) if side == "at most" else np.argmin(v, -1)
        return self._sure(Found(np.take_along_axis(v, index[..., np.newaxis], -1)[..., 0], f[index]))

    def _sure(self, found: Found) -> Found:
        """Refuse a nominal value that is none; never a silent number."""
        if found.value.ndim == 0 and not np.isfinite(found.value):
            raise InvalidMeasurement(f"{self.name} cannot be told: {self.meaning}", "Look at the trace.")
        return found

    def _values(
        self,
        f_hz: FloatArray,
        network: TwoPort | ComplexArray,
        band: tuple[float, float],
        parameters: Mapping[str, Any],
    ) -> tuple[FloatArray, FloatArray]:
        """Frequencies of a band and the trace there, edges included."""
        rest = {k: v for k, v in parameters.items() if k not in ("over", "at")}
        if self.between is not None:
            where = samples(f_hz, *band)
            return where, self.between(f_hz, network, where, **rest)
        assert self.trace is not None  # a kind has exactly one way, see the table's test
        return in_band(f_hz, self.trace(f_hz, network, **rest), *band)
