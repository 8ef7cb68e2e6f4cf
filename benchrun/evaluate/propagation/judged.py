"""The limits of a judge step, and what their figures' uncertainty comes to."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.network import Network
from benchrun.evaluate.propagation.influences import influences
from benchrun.evaluate.propagation.kernel import Kernel
from benchrun.evaluate.propagation.propagate import FigureSpread, Propagated, propagate
from benchrun.evaluate.propagation.quantities import Quantity, near
from benchrun.evaluate.propagation.trail import Trail
from benchrun.evaluate.propagation.trials import generator
from benchrun.rf.tone import Tone
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.steps.judge import FigureLimit
from benchrun.uncertainty.decision import COVERAGE_FACTOR
from benchrun.uncertainty.montecarlo import Effort
from benchrun.uncertainty.sources import Sources

__all__ = ["bounds", "judged", "stepped"]

_NOISE_ROWS = 20


def stepped(trail: Trail, sources: Sources, network: Network, seed: int) -> Network:
    """The network with first-order variations: each influence one standard uncertainty off, then noise.

    Fast, and enough for a provisional judgement and for masks, which are judged point by point.
    """
    kernel = Kernel(trail, influences(trail, sources))
    moved = kernel.run(np.eye(kernel.axes), None)
    if kernel.noisy:
        chance = generator(seed, 0, 0)
        noisy = kernel.run(np.zeros((_NOISE_ROWS, kernel.axes)), chance)
        if isinstance(moved, TwoPort) and isinstance(noisy, TwoPort):
            moved = TwoPort(*(np.concatenate(p) for p in zip(moved.planes, noisy.planes, strict=True)))
        elif not isinstance(moved, TwoPort) and not isinstance(noisy, TwoPort):
            moved = np.concatenate([moved, noisy])
    return replace(network, varied=moved, systematic=kernel.axes)


def judged(
    trail: Trail,
    sources: Sources,
    network: Network,
    limits: Sequence[tuple[int, FigureLimit, Mapping[str, object]]],
    effort: Effort,
    seed: int,
) -> tuple[Propagated, dict[tuple[int, str], FigureSpread]]:
    """Propagate to the figures of some limits.

    Parameters
    ----------
    limits
        Number of the limit in its step, the limit, and the figure's complete parameters.

    Returns
    -------
    Propagated, dict
        All of it; and by number and side the figures that the nominal network has.
    """
    assert not isinstance(network.nominal, Tone)  # a trail leads to S-parameters
    asked: list[tuple[tuple[int, str], Quantity]] = []
    for number, limit, parameters in limits:
        points = near(network.f_hz, limit.kind, parameters)
        for side in limit.bounds:
            try:
                found = limit.kind.measure(network.f_hz, network.nominal, side, **parameters)
            except InvalidMeasurement:
                continue  # said where it is judged
            one = Quantity(limit.text, limit.kind, side, parameters, float(found.value), points)
            asked.append(((number, side), one))
    result = propagate(trail, sources, [one for _, one in asked], effort, seed)
    return result, {key: spread for (key, _), spread in zip(asked, result.figures, strict=True)}


def bounds(spread: FigureSpread, sense: int) -> tuple[float, float]:
    """Expanded uncertainty upwards and downwards, in the unit of the value; infinite if not resolvable.

    For decibels of one magnitude ``+20 log10(1 + U/|S|)`` and ``-20 log10(1 - U/|S|)``.
    """
    expanded = COVERAGE_FACTOR * spread.departure(sense)
    if not sense:
        return expanded, expanded
    more = 20.0 * math.log10(1.0 + expanded) if math.isfinite(expanded) else math.inf
    less = -20.0 * math.log10(1.0 - expanded) if expanded < 1.0 else math.inf
    return (more, less) if sense > 0 else (less, more)
