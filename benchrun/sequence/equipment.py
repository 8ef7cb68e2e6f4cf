"""Whole-file checks of a sequence against its masks and the bench."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

import numpy as np

from benchrun.errors import Problem
from benchrun.quantity import Dimension, render
from benchrun.rf.masks import Mask
from benchrun.rf.twoport import FloatArray
from benchrun.sequence.bench import Bench
from benchrun.sequence.files import Loaded
from benchrun.sequence.models import Sequence, SweepSetup
from benchrun.sequence.resolve import grid_of, outside, span, step_paths
from benchrun.sequence.steps import Judge, Tone
from benchrun.sequence.steps.judge import MaskLimit

__all__ = ["check_bench", "check_masks"]


def check_masks(loaded: Loaded[Sequence], masks: Mapping[str, Mask]) -> list[Problem]:
    """Check that masks lie within their sweep, meet points of it, and cover the band they should.

    Parameters
    ----------
    loaded
        The sequence.
    masks
        By the name that the sequence uses; a name that is not there is not checked.
    """
    problems = []
    for step, path in step_paths(loaded):
        if not isinstance(step, Judge):
            continue
        grid = grid_of(loaded.model, step.from_)
        for i, limit in enumerate(step.limits):
            if isinstance(limit, MaskLimit) and limit.mask in masks:
                for text, key, advice in _mask(limit, masks[limit.mask], grid):
                    problems.append(loaded.document.problem(text, (*path, "limits", i, key), advice))
    return problems


def _mask(limit: MaskLimit, mask: Mask, grid: FloatArray | None) -> Iterator[tuple[str, str, str]]:
    if limit.over and (gap := _gap(mask, *limit.over)):
        yield (
            f"mask {limit.mask} must cover {span(*limit.over)}, but has no line from {span(*gap)}",
            "over",
            "Lengthen the mask or shorten the band.",
        )
    counted = any(line.relative_to == "figure" for line in mask.lines)
    if counted and limit.reference is None:
        yield (
            f"mask {limit.mask} counts from a figure, but the limit names none",
            "mask",
            "Add for example `reference: {figure: insertion loss, at: 169.4 MHz}`.",
        )
    if limit.reference and not counted:
        yield f"mask {limit.mask} counts from no figure", "reference", "Take `reference` out."
    if grid is None:
        return
    counts_at = limit.reference.at if limit.reference else None
    if counts_at is not None and outside(counts_at, counts_at, grid):
        yield (
            f"the reference of the mask lies at {span(counts_at, counts_at)}, but the sweep covers "
            f"{span(grid[0], grid[-1])}",
            "reference",
            "Widen the sweep or take another frequency.",
        )
    low, high = mask.band
    if outside(low, high, grid):
        yield (
            f"mask {limit.mask} covers {span(low, high)}, but the sweep only {span(grid[0], grid[-1])}",
            "mask",
            "Widen the sweep or shorten the mask.",
        )
    for line in mask.lines:
        if not np.any(line.inside(grid)):
            yield (
                f"mask {limit.mask} has a line from {span(line.f_hz[0], line.f_hz[-1])}, "
                "where the sweep has no point",
                "mask",
                "Use more points.",
            )


def _gap(mask: Mask, low: float, high: float) -> tuple[float, float] | None:
    """Find the first part of a band that no line covers."""
    reached = low
    for line in sorted(mask.lines, key=lambda x: float(x.f_hz[0])):
        if line.f_hz[0] > reached:
            break
        reached = max(reached, float(line.f_hz[-1]))
    if reached >= high:
        return None
    following = [float(x.f_hz[0]) for x in mask.lines if x.f_hz[0] > reached]
    return reached, min([high, *following])


def check_bench(loaded: Loaded[Sequence], bench: Bench) -> list[Problem]:
    """Check sweeps against the analyzer's range, and power against what unit, port and receiver withstand."""
    problems = list(_roles(loaded, bench))
    for step, path in step_paths(loaded):
        if isinstance(step, Tone):
            for text, key, advice in _tone(loaded.model, step, bench):
                problems.append(loaded.document.problem(text, (*path, key), advice))
    if "analyzer" not in bench.instruments:
        return problems
    for name, sweep in loaded.model.sweeps.items():
        for text, key, advice in (*_range(name, sweep, bench), *_power(loaded.model, sweep, bench)):
            problems.append(loaded.document.problem(text, ("sweeps", name, key), advice))
    return problems


def _roles(loaded: Loaded[Sequence], bench: Bench) -> Iterator[Problem]:
    for step, path in step_paths(loaded):
        for role in step.roles:
            if role not in bench.instruments:
                yield loaded.document.problem(
                    f"step {step.name} needs a {role}, which bench {bench.bench} does not have",
                    path,
                    f"It has: {', '.join(bench.instruments)}. Use another bench.",
                )


def _tone(sequence: Sequence, step: Tone, bench: Bench) -> Iterator[tuple[str, str, str]]:
    levels, unit, key = step.grid_dbm(), sequence.unit, "level" if step.level is not None else "levels"
    generator, receiver = bench.instruments.get("generator"), bench.instruments.get("spectrum analyzer")
    top = float(levels[-1])
    if top > unit.withstands.power:
        yield (
            f"{top:g} dBm is more than the unit withstands ({unit.withstands.power:g} dBm)",
            key,
            "Lower the level.",
        )
    can = generator.range if generator else None
    if can and not can.frequency[0] <= step.at <= can.frequency[1]:
        yield f"the generator of {bench.bench} covers only {span(*can.frequency)}", "at", "Use another bench."
    if can and can.power and not (can.power[0] <= levels[0] and top <= can.power[1]):
        low, high = can.power
        yield (
            f"the generator of {bench.bench} gives {low:g} to {high:g} dBm, not {levels[0]:g} to {top:g} dBm",
            key,
            "Change the level.",
        )
    if receiver and receiver.range and step.at * step.harmonics > receiver.range.frequency[1]:
        yield (
            f"harmonic {step.harmonics} lies beyond the spectrum analyzer's "
            f"{span(*receiver.range.frequency)}",
            "harmonics" if step.harmonics > 1 else "at",
            "Read fewer harmonics.",
        )
    withstands = [port.withstands.power for port in receiver.ports.values()] if receiver else []
    reaches = top + max(unit.gain, 0.0)
    if withstands and reaches > min(withstands):
        yield (
            f"{top:g} dBm and a gain of {unit.gain:g} dB bring {reaches:g} dBm to a port that "
            f"withstands {min(withstands):g} dBm",
            key,
            "Lower the level or put a pad before the port.",
        )


def _range(name: str, sweep: SweepSetup, bench: Bench) -> Iterator[tuple[str, str, str]]:
    can, grid, owner = bench.analyzer.range, sweep.grid(), f"the analyzer of {bench.bench}"
    if can is None:
        return
    low, high = can.frequency
    if outside(grid[0], grid[-1], np.array([low, high])):
        key = "at" if sweep.at is not None else "to" if grid[-1] > high else "from"
        yield (
            f"sweep {name} covers {span(grid[0], grid[-1])}, but {owner} only {span(low, high)}",
            key,
            "Narrow the sweep or use another bench.",
        )
    if len(grid) > can.points:
        key = "at" if sweep.at is not None else "points"
        yield f"sweep {name} has {len(grid)} points, {owner} at most {can.points}", key, "Use fewer points."
    if can.power and not can.power[0] <= sweep.power <= can.power[1]:
        yield (
            f"{sweep.power:g} dBm is outside the {can.power[0]:g} to {can.power[1]:g} dBm of {owner}",
            "power",
            "Change the power.",
        )
    if can.bandwidth and not can.bandwidth[0] <= sweep.bandwidth <= can.bandwidth[1]:
        yield (
            f"{render(sweep.bandwidth, Dimension.FREQUENCY)} is outside the IF bandwidths "
            f"{span(*can.bandwidth)} of {owner}",
            "bandwidth",
            "Change the bandwidth.",
        )


def _power(sequence: Sequence, sweep: SweepSetup, bench: Bench) -> Iterator[tuple[str, str, str]]:
    unit = sequence.unit
    if sweep.power > unit.withstands.power:
        yield (
            f"{sweep.power:g} dBm is more than the unit withstands ({unit.withstands.power:g} dBm)",
            "power",
            "Lower the power.",
        )
    reaches = sweep.power + max(unit.gain, 0.0)
    withstands = [port.withstands.power for port in bench.analyzer.ports.values()]
    if withstands and reaches > min(withstands):
        yield (
            f"{sweep.power:g} dBm and a gain of {unit.gain:g} dB bring {reaches:g} dBm to a port that "
            f"withstands {min(withstands):g} dBm",
            "power",
            "Lower the power or put a pad before the port.",
        )
