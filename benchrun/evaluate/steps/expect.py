"""The difference between what was measured and what was designed, judged with its uncertainty."""

from __future__ import annotations

import functools
from collections.abc import Mapping

import numpy as np

from benchrun.evaluate.judgement import JudgedFigure, told
from benchrun.evaluate.network import combine
from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.propagation.judged import stepped
from benchrun.evaluate.readings import Raw
from benchrun.evaluate.state import State
from benchrun.hookup import Hookup
from benchrun.rf.figures.band import decibels
from benchrun.rf.twoport import FloatArray
from benchrun.sequence.steps import Expect
from benchrun.sequence.steps.design import Design
from benchrun.uncertainty.decision import COVERAGE_FACTOR

__all__ = ["ExpectArithmetic"]

_DRAWS, _SEED = 1000, 1
"""Pieces drawn for the corridor, and from where: the same design gives the same corridor in every audit."""


class ExpectArithmetic:
    """Lay the corridor of the design over a trace."""

    def hookups(self, step: Expect, procedure: Procedure) -> tuple[Hookup, ...]:
        """Nothing to connect."""
        return ()

    def apply(self, step: Expect, state: State, readings: Mapping[str, Raw]) -> None:
        """Leave two judged figures: the tightest point from above, and from below."""
        network, trail = state.networks[step.from_], state.trails.get(step.from_)
        if trail is not None:
            network = stepped(trail, state.procedure.sources, network, state.procedure.noise_seed)
        low, high = step.over
        inside = (network.f_hz >= low * (1 - 1e-12)) & (network.f_hz <= high * (1 + 1e-12))
        f_hz = network.f_hz[inside]
        nominal, varied = network.plane(step.trace)
        size = np.abs(nominal[inside])
        designed, lower, upper = _corridor(step.design, step.trace, step.within, tuple(f_hz.tolist()))
        difference = decibels(size) - designed
        up = down = None
        if varied is not None:
            spread = np.abs(varied[:, inside]) / np.maximum(size, 1e-20) - 1.0
            relative = COVERAGE_FACTOR * combine(spread, network.systematic)
            up = 20.0 * np.log10(1.0 + relative)
            down = np.where(relative < 1.0, -20.0 * np.log10(np.maximum(1.0 - relative, 1e-20)), np.inf)
        judged = list[JudgedFigure]()
        for side, edge in (("at least", lower), ("at most", upper)):
            limit = edge - designed
            margin = limit - difference if side == "at most" else difference - limit
            towards = up if side == "at most" else down
            guard = 0.0 if towards is None or step.rule.factor == 0 else step.rule.factor * towards
            worst = int(np.argmin(margin - guard))
            judged.append(
                told(
                    f"{step.trace} less its design, {side}", float(difference[worst]), "dB",
                    float(limit[worst]), side, float(f_hz[worst]), step.rule,
                    None if up is None else float(up[worst]), None if down is None else float(down[worst]),
                )
            )  # fmt: skip
        state.judged[step.name] = tuple(judged)


@functools.lru_cache(8)
def _corridor(
    design: Design, trace: str, within_db: float, f_hz: tuple[float, ...]
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Designed level, and the corridor that pieces within tolerance keep, in dB, ``(f,)`` each."""
    grid, ladder = np.array(f_hz), design.ladder
    lower, upper = ladder.expected(grid, trace, _DRAWS, _SEED, within_db).lines
    return decibels(ladder.response(grid).parameter(trace)), lower.level_db, upper.level_db
