"""Figures and masks against their limits, each with its own uncertainty and the named decision rule."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import replace
from typing import Any, TypeAlias

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.judgement import JudgedFigure, not_told, told
from benchrun.evaluate.network import Data, Network, combine
from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.propagation.judged import bounds, stepped
from benchrun.evaluate.propagation.judged import judged as judged_spreads
from benchrun.evaluate.propagation.propagate import FigureSpread
from benchrun.evaluate.propagation.trail import Trail
from benchrun.evaluate.readings import Raw
from benchrun.evaluate.state import State
from benchrun.hookup import Hookup
from benchrun.rf.figures.band import at, decibels
from benchrun.rf.masks import MaskLine
from benchrun.rf.tone import Tone
from benchrun.rf.twoport import FloatArray, TwoPort
from benchrun.sequence.steps import Judge
from benchrun.sequence.steps.judge import FigureLimit, FigureText, MaskLimit
from benchrun.uncertainty.decision import COVERAGE_FACTOR, Rule

__all__ = ["JudgeArithmetic"]

_NOISY = "decided by noise: use a narrower bandwidth or more averages"

Spreads: TypeAlias = Mapping[tuple[int, str], FigureSpread]
"""By position of the limit in its step, and side."""


class JudgeArithmetic:
    """Judge every limit of a step."""

    def hookups(self, step: Judge, procedure: Procedure) -> tuple[Hookup, ...]:
        """Nothing to connect."""
        return ()

    def apply(self, step: Judge, state: State, readings: Mapping[str, Raw]) -> None:
        """Leave judged figures."""
        network, judged = state.networks[step.from_], list[JudgedFigure]()
        spreads: Spreads = {}
        if (trail := state.trails.get(step.from_)) is not None:
            network, spreads = _propagated(step, state, trail, network)
        for position, limit in enumerate(step.limits):
            rule = limit.rule or step.rule
            if isinstance(limit, MaskLimit):
                lines = state.procedure.masks[limit.mask].lines
                for number, line in enumerate(lines, 1):
                    name = f"{limit.text}, line {number}" if len(lines) > 1 else limit.text
                    judged.append(_judge_line(name, line, network, limit, rule))
            else:
                own = {side: spread for (at_limit, side), spread in spreads.items() if at_limit == position}
                judged.extend(_judge_figure(limit, network, rule, own))
        state.judged[step.name] = tuple(judged)


def _propagated(step: Judge, state: State, trail: Trail, network: Network) -> tuple[Network, Spreads]:
    """What the declared sources come to: first-order variations at once, then the trials."""
    procedure, seed = state.procedure, state.procedure.noise_seed
    network = stepped(trail, procedure.sources, network, seed)
    limits = [
        (position, limit, _in_impedance(limit, network))
        for position, limit in enumerate(step.limits)
        if isinstance(limit, FigureLimit)
    ]
    if state.provisional or not limits:
        return network, {}
    state.propagated[step.name], spreads = judged_spreads(
        trail, procedure.sources, network, limits, procedure.effort, seed
    )
    return network, spreads


def _judge_figure(
    limit: FigureLimit, network: Network, rule: Rule, spreads: Mapping[str, FigureSpread]
) -> Iterator[JudgedFigure]:
    kind, unit = limit.kind, limit.kind.dimension.unit or "1"
    parameters = _in_impedance(limit, network)
    for side, bound in limit.bounds.items():
        name = limit.text if len(limit.bounds) == 1 else f"{limit.text}, {side}"
        try:
            found = kind.measure(network.f_hz, network.nominal, side, **parameters)
        except InvalidMeasurement as error:
            # Limits on both sides that the sweep covers, and no such frequency in it: outside for certain.
            yield not_told(name, unit, bound, side, rule, error.reason, failed=len(limit.bounds) == 2)
            continue
        value = float(found.value)
        up = down = None
        if side in spreads:
            up, down = bounds(spreads[side], kind.sense)
        elif network.varied is not None:
            near = _near(network.f_hz, limit)
            varied = _sliced(network.varied, near)
            moved = kind.measure(network.f_hz[near], varied, side, **parameters).value
            if kind.sense:
                up, down = _decibel_bounds(
                    10.0 ** (kind.sense * (moved - value) / 20.0) - 1.0, network.systematic
                )
                up, down = (up, down) if kind.sense > 0 else (down, up)
            else:
                up = down = COVERAGE_FACTOR * float(combine(moved - value, network.systematic))
        figure = told(name, value, unit, bound, side, float(found.at_hz), rule, up, down)
        if side in spreads and spreads[side].noisy and not figure.remark:
            figure = replace(figure, remark=_NOISY)
        yield figure


def _in_impedance(limit: FigureText, network: Network) -> dict[str, Any]:
    """A figure's parameters; the reference impedance is the result's own, unless the limit names another."""
    if "reference" in limit.kind.parameters and limit.reference is None:
        return {**limit.parameters, "reference": network.impedance(limit.parameters.get("port", 1)).real}
    return limit.parameters


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


def _judge_line(name: str, line: MaskLine, network: Network, limit: MaskLimit, rule: Rule) -> JudgedFigure:
    """One line of a mask: the point with the least margin after its guard band decides."""
    nominal, varied = network.plane(limit.trace)
    size, sizes = np.abs(nominal), None if varied is None else np.abs(varied)
    if line.relative_to:
        # Each variation counts from its own reference: what both have in common drops out.
        base, bases = _counted_from(line, network, limit, size, sizes)
        size, sizes = size / base, None if sizes is None else sizes / bases
        name = f"{name}, relative to {'the peak' if line.relative_to == 'peak' else limit.reference_text}"
    f_hz = line.samples(network.f_hz)
    level, bound = at(network.f_hz, decibels(size), f_hz), line.limit_at(f_hz)
    up = down = None
    if sizes is not None:
        relative = COVERAGE_FACTOR * combine(sizes / np.maximum(size, 1e-20) - 1.0, network.systematic)
        relative = at(network.f_hz, relative, f_hz)
        up = 20.0 * np.log10(1.0 + relative)
        down = np.where(relative < 1.0, -20.0 * np.log10(np.maximum(1.0 - relative, 1e-20)), np.inf)
    margin = bound - level if line.side == "at most" else level - bound
    towards = up if line.side == "at most" else down
    guard = np.zeros_like(margin) if towards is None or rule.factor == 0 else rule.factor * towards
    worst = int(np.argmin(margin - guard))
    return told(
        name, float(level[worst]), "dB", float(bound[worst]), line.side, float(f_hz[worst]), rule,
        None if up is None else float(up[worst]), None if down is None else float(down[worst]),
    )  # fmt: skip


def _counted_from(
    line: MaskLine, network: Network, limit: MaskLimit, size: FloatArray, sizes: FloatArray | None
) -> tuple[float, FloatArray]:
    """Magnitude that a relative line counts from: nominal, and under each variation ``(v, 1)``."""
    if line.relative_to == "peak":
        bases = np.zeros((0, 1)) if sizes is None else np.max(sizes, -1, keepdims=True)
        return float(np.max(size)), bases
    figure = limit.reference
    if figure is None:
        raise RuntimeError("a mask that counts from a figure was never checked")

    def magnitude(data: Data) -> FloatArray:
        parameters = _in_impedance(figure, network)
        found = figure.kind.measure(network.f_hz, data, "at most", **parameters).value
        return np.asarray(10.0 ** (figure.kind.sense * found / 20.0))

    bases = np.zeros(0) if network.varied is None else magnitude(network.varied)
    return float(magnitude(network.nominal)), bases[..., np.newaxis]
