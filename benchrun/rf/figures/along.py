"""Figures along a line: distance to a fault, how large it is, impedance at a place."""

from __future__ import annotations

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.quantity import Dimension, render
from benchrun.rf.figures.kind import FigureKind, Found, Parameter
from benchrun.rf.figures.level import reflection
from benchrun.rf.figures.linear import LIGHT
from benchrun.rf.timedomain import Fault, greatest_reflection, harmonics, impedance_at
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["KINDS"]

_PORT = Parameter("port", default=1)
_VELOCITY = Parameter("value", Dimension.NUMBER)
_WITHIN = Parameter("range", Dimension.LENGTH, optional=True)


def _fault(
    f_hz: FloatArray,
    network: TwoPort | ComplexArray,
    velocity: float,
    within: tuple[float, float] | None,
    port: int,
) -> Fault:
    span = (
        None if within is None else (2 * within[0] / (velocity * LIGHT), 2 * within[1] / (velocity * LIGHT))
    )
    return greatest_reflection(f_hz, reflection(network, port), span)


def _found(f_hz: FloatArray, value: FloatArray) -> Found:
    return Found(value, np.full(value.shape, (f_hz[0] + f_hz[-1]) / 2.0))


def _distance(
    f_hz: FloatArray,
    network: TwoPort | ComplexArray,
    velocity: float,
    within: tuple[float, float] | None = None,
    port: int = 1,
) -> Found:
    fault = _fault(f_hz, network, velocity, within, port)
    return _found(f_hz, fault.time_s * velocity * LIGHT / 2.0)


def _size(
    f_hz: FloatArray,
    network: TwoPort | ComplexArray,
    velocity: float,
    within: tuple[float, float] | None = None,
    port: int = 1,
) -> Found:
    return _found(f_hz, -20.0 * np.log10(_fault(f_hz, network, velocity, within, port).size))


def _impedance(
    f_hz: FloatArray,
    network: TwoPort | ComplexArray,
    distance: float,
    velocity: float,
    port: int = 1,
    reference: float = 50.0,
) -> Found:
    samples = harmonics(f_hz, reflection(network, port))
    # Half the width of the step's rise: what lies nearer than that to a joint is the joint still.
    cell = velocity * LIGHT / (4.0 * samples.step_hz * samples.plane.shape[-1])
    if distance < cell:
        raise InvalidMeasurement(
            f"the impedance is asked for at {render(distance, Dimension.LENGTH)}, but the sweep resolves "
            f"only {render(cell, Dimension.LENGTH)} of this line.",
            "Sweep to a higher frequency, or look farther along.",
        )
    return _found(f_hz, impedance_at(samples, 2.0 * distance / (velocity * LIGHT), reference))


_PEAK = (
    "the greatest peak of the band-pass impulse response of S11 (Kaiser window) `within` a stretch of line, "
    "or up to where the sweep repeats; it must stand out of the whole response's median six times"
)

KINDS = (
    FigureKind(
        "distance to fault",
        Dimension.LENGTH,
        f"half the delay times `velocity` times c of {_PEAK}; given as of the sweep's middle frequency",
        {"velocity": _VELOCITY, "within": _WITHIN, "port": _PORT},
        ports=1,
        scalar=_distance,
        local=False,
    ),
    FigureKind(
        "return loss of the fault",
        Dimension.RATIO,
        f"-20 log10 of the height of {_PEAK}; loss on the way is not taken out; given as of the sweep's "
        "middle frequency",
        {"velocity": _VELOCITY, "within": _WITHIN, "port": _PORT},
        ports=1,
        scalar=_size,
        sense=-1,
        local=False,
    ),
    FigureKind(
        "impedance at distance",
        Dimension.IMPEDANCE,
        "`reference` (1 + r) / (1 - r) of the low-pass step response r of S11 (Kaiser window) at `distance` "
        "along a line of `velocity` times c, the value at 0 Hz found by causality unless the sweep has it; "
        "later echoes of mismatches before it are not taken out; given as of the sweep's middle frequency",
        {
            "distance": Parameter("value", Dimension.LENGTH),
            "velocity": _VELOCITY,
            "port": _PORT,
            "reference": Parameter("value", Dimension.IMPEDANCE, default=50.0),
        },
        ports=1,
        scalar=_impedance,
        local=False,
    ),
)
