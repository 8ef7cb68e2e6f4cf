"""Figures and masks against their limits, each with its own uncertainty and the named decision rule."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.judgement import JudgedFigure, not_told, told
from benchrun.evaluate.network import Data, Network, combine
from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.readings import Raw
from benchrun.evaluate.state import State
from benchrun.hookup import Hookup
from benchrun.rf.figures.band import at, decibels
from benchrun.rf.masks import MaskLine
from benchrun.rf.tone import Tone
from benchrun.rf.twoport import FloatArray, TwoPort
from benchrun.sequence.steps import Judge
from benchrun.sequence.steps.judge import FigureLimit, MaskLimit
from benchrun.uncertainty.decision import COVERAGE_FACTOR, Rule

__all__ = ["JudgeArithmetic"]


class JudgeArithmetic:
    """Judge every limit of a step."""

    def hookups(self, step: Judge, procedure: Procedure) -> tuple[Hookup, ...]:
        """Nothing to connect."""
        return ()

    def apply(self, step: Judge, state: State, readings: Mapping[str, Raw]) -> None:
        """Leave judged figures."""
        network, judged = state.networks[step.from_], list[JudgedFigure]()
        for limit in step.limits:
            rule = limit.rule or step.rule
            if isinstance(limit, MaskLimit):
                lines = state.procedure.masks[limit.mask].lines
                for number, line in enumerate(lines, 1):
                    name = f"{limit.text}, line {number}" if len(lines) > 1 else limit.text
                    judged.append(_judge_line(name, line, network, limit.trace, rule))
            else:
                judged.extend(_judge_figure(limit, network, rule))
        state.judged[step.name] = tuple(judged)


def _judge_figure(limit: FigureLimit, network: Network, rule: Rule) -> Iterator[JudgedFigure]:
    kind, unit = limit.kind, limit.kind.dimension.unit or "1"
    for side, bound in limit.bounds.items():
        name = limit.text if len(limit.bounds) == 1 else f"{limit.text}, {side}"
        try:
            found = kind.measure(network.f_hz, network.nominal, side, **limit.parameters)
        except InvalidMeasurement as error:
            # Limits on both sides that the sweep covers, and no such frequency in it: outside for certain.
            yield not_told(name, unit, bound, side, rule, error.reason, failed=len(limit.bounds) == 2)
            continue
        value = float(found.value)
        up = down = None
        if network.varied is not None:
            near = _near(network.f_hz, limit)
            varied = _sliced(network.varied, near)
            moved = kind.measure(network.f_hz[near], varied, side, **limit.parameters).value
            if kind.sense:
                up, down = _decibel_bounds(
                    10.0 ** (kind.sense * (moved - value) / 20.0) - 1.0, network.systematic
                )
                up, down = (up, down) if kind.sense > 0 else (down, up)
            else:
                up = down = COVERAGE_FACTOR * float(combine(moved - value, network.systematic))
        yield told(name, value, unit, bound, side, float(found.at_hz), rule, up, down)


def _near(f_hz: FloatArray, limit: FigureLimit) -> slice:
    """The samples that a limit needs: its bands, and some more at each end to interpolate the edges."""
    band = limit.kind.band(limit.parameters) if limit.kind.local else None
    if band is None:
        return slice(None)
    bands = (band, limit.against or band)
    first = np.searchsorted(f_hz, min(low for low, _ in bands) * (1 - 1e-12))
    last = np.searchsorted(f_hz, max(high for _, high in bands) * (1 + 1e-12))
    return slice(max(int(first) - 2, 0), int(last) + 2)


def _sliced(data: Data, near: slice) -> Data:
    if isinstance(data, Tone):
        return data
    return data.map(lambda plane: plane[..., near]) if isinstance(data, TwoPort) else data[..., near]


def _decibel_bounds(relative: FloatArray, systematic: int) -> tuple[float, float]:
    """Upper and lower expanded uncertainty in dB, from relative changes of a magnitude ``(v,)``.

    ``+20 log10(1 + U/|S|)`` and ``-20 log10(1 - U/|S|)``; the lower one is infinite where U reaches |S|.
    """
    expanded = COVERAGE_FACTOR * float(combine(relative, systematic))
    lower = -20.0 * math.log10(1.0 - expanded) if expanded < 1.0 else math.inf
    return 20.0 * math.log10(1.0 + expanded), lower


def _judge_line(name: str, line: MaskLine, network: Network, trace: str, rule: Rule) -> JudgedFigure:
    """One line of a mask: the point with the least margin after its guard band decides."""
    nominal, varied = network.plane(trace)
    # A corner of the line between two samples may be the tightest place, so corners count as samples.
    f_hz = np.unique(np.concatenate([network.f_hz[line.inside(network.f_hz)], line.f_hz]))
    level, limit = at(network.f_hz, decibels(nominal), f_hz), line.limit_at(f_hz)
    up = down = None
    if varied is not None:
        magnitude = np.maximum(np.abs(nominal), 1e-20)
        relative = COVERAGE_FACTOR * combine(np.abs(varied) / magnitude - 1.0, network.systematic)
        relative = at(network.f_hz, relative, f_hz)
        up = 20.0 * np.log10(1.0 + relative)
        down = np.where(relative < 1.0, -20.0 * np.log10(np.maximum(1.0 - relative, 1e-20)), np.inf)
    margin = limit - level if line.side == "at most" else level - limit
    towards = up if line.side == "at most" else down
    guard = np.zeros_like(margin) if towards is None or rule.factor == 0 else rule.factor * towards
    worst = int(np.argmin(margin - guard))
    return told(
        name, float(level[worst]), "dB", float(limit[worst]), line.side, float(f_hz[worst]), rule,
        None if up is None else float(up[worst]), None if down is None else float(down[worst]),
    )  # fmt: skip
