"""Whole-file checks: what can be known to go wrong before anything moves."""

from __future__ import annotations

import datetime
import re
from collections.abc import Iterator, Mapping

import numpy as np

from benchrun.errors import InputError, Problem
from benchrun.quantity import Dimension, render
from benchrun.rf.calibration import METHODS
from benchrun.rf.masks import Mask
from benchrun.sequence.bench import Bench
from benchrun.sequence.files import Loaded
from benchrun.sequence.kit import KitFile
from benchrun.sequence.models import Sequence
from benchrun.sequence.steps import Calibrate, Judge, StepModel
from benchrun.sequence.steps.judge import FigureLimit, MaskLimit

__all__ = ["check_bench", "check_kits", "check_masks", "check_sequence", "check_serial"]

_SAFE_SERIAL = re.compile(r"[A-Za-z0-9][A-Za-z0-9._+-]{0,63}")


def check_serial(serial: str, sequence: Sequence) -> str:
    """A serial number that fits, or a refusal.

    Raises
    ------
    InputError
        If it does not match the sequence's pattern, or could be a path or an instrument message.
    """
    if not _SAFE_SERIAL.fullmatch(serial) or ".." in serial:
        raise InputError(f"serial number {serial!r} holds characters that no serial number may hold; allowed are letters, "
                         "digits and . _ + - (at most 64, beginning with a letter or digit)")  # fmt: skip
    if not re.fullmatch(sequence.unit.serial, serial):
        raise InputError(f"serial number {serial!r} does not match the pattern {sequence.unit.serial!r} of {sequence.sequence}; "
                         "read the label once more")  # fmt: skip
    return serial


def check_sequence(loaded: Loaded[Sequence]) -> list[Problem]:
    """Names, order, limits inside sweeps, apertures: all that the sequence alone can tell."""
    return [*_names(loaded), *_bands(loaded), *_ports(loaded)]


def _paths(loaded: Loaded[Sequence]) -> list[tuple[StepModel, tuple[object, ...]]]:
    return [(step, ("steps", i, step.kind)) for i, step in enumerate(loaded.model.steps)]


def _names(loaded: Loaded[Sequence]) -> Iterator[Problem]:
    document, sequence = loaded.document, loaded.model
    standing: dict[tuple[str, str], int] = {("sweep", name): -1 for name in sequence.sweeps}
    later = {(step.leaves, step.name): i for i, step in enumerate(sequence.steps)}
    taken: dict[str, int] = {}
    for index, (step, path) in enumerate(_paths(loaded)):
        for key, (kind, name) in step.needs().items():
            if (kind, name) in standing:
                continue
            if (kind, name) in later:
                where = (
                    "itself"
                    if later[kind, name] == index
                    else f"step {later[kind, name] + 1}, which comes later"
                )
                yield document.problem(
                    f"`{key}: {name}` refers to {where}", (*path, key), "Put the step it needs before it."
                )
            else:
                known = ", ".join(n for k, n in standing if k == kind) or "none"
                yield document.problem(f"`{key}: {name}` names no {kind} that stands before this step", (*path, key),
                                       f"Standing here: {known}.")  # fmt: skip
        if step.name in taken:
            yield document.problem(f"the name {step.name!r} is used by step {taken[step.name] + 1} already", (*path, "as"),
                                   "Give each step its own name.")  # fmt: skip
        taken.setdefault(step.name, index)
        standing[step.leaves, step.name] = index
    if not any(isinstance(step, Judge) for step in sequence.steps):
        yield document.problem("has no step that judges, so nothing could ever be concluded", ("steps",), "Add a `judge` step.",
                               key=True)  # fmt: skip


def _source(sequence: Sequence, name: str) -> StepModel | None:
    """The sweep step that a network comes from; only steps further up are followed, so a circle ends."""
    wanted: str | None = name
    for step in reversed(sequence.steps):
        if step.name == wanted and step.leaves == "network":
            wanted = getattr(step, "from_", None)
            if wanted is None:
                return step
    return None


def _grid_of(sequence: Sequence, name: str) -> np.ndarray[tuple[int], np.dtype[np.float64]] | None:
    step = _source(sequence, name)
    try:
        return sequence.sweep_of(step).grid() if step is not None else None
    except (KeyError, StopIteration):
        return None  # a name that does not resolve is reported elsewhere


def _bands(loaded: Loaded[Sequence]) -> Iterator[Problem]:
    for step, path in _paths(loaded):
        if not isinstance(step, Judge):
            continue
        grid = _grid_of(loaded.model, step.from_)
        if grid is None:
            continue
        for i, limit in enumerate(step.limits):
            if isinstance(limit, FigureLimit):
                yield from _figure_band(loaded, limit, (*path, "limits", i), grid)


def _figure_band(loaded: Loaded[Sequence], limit: FigureLimit, path: tuple[object, ...],
                 grid: np.ndarray[tuple[int], np.dtype[np.float64]]) -> Iterator[Problem]:  # fmt: skip
    band = limit.kind.band(limit.parameters)
    spans = [(band, "over" if limit.over else "at")] if band else []
    if limit.against:
        spans.append((limit.against, "against"))
    for (low, high), key in spans:
        if low < grid[0] * (1 - 1e-12) or high > grid[-1] * (1 + 1e-12):
            asked, swept = _span(low, high), _span(grid[0], grid[-1])
            reach = " (half an aperture included)" if limit.aperture else ""
            yield loaded.document.problem(f"{limit.figure} looks at {asked}{reach}, but the sweep covers {swept}", (*path, key),
                                          "Widen the sweep or narrow the band.")  # fmt: skip
    if limit.aperture is not None and band:
        inside = (grid >= band[0]) & (grid <= band[1])
        step_hz = float(np.max(np.diff(grid[inside]))) if inside.sum() > 1 else float("inf")
        if limit.aperture < step_hz:
            yield loaded.document.problem(
                f"the aperture {render(limit.aperture, Dimension.FREQUENCY)} is narrower than the sweep's step of "
                f"{render(step_hz, Dimension.FREQUENCY) if np.isfinite(step_hz) else 'more than the band'}",
                (*path, "aperture"), "Use more points or a wider aperture.")  # fmt: skip


def _span(low: float, high: float) -> str:
    return f"{render(float(low), Dimension.FREQUENCY)} to {render(float(high), Dimension.FREQUENCY)}"


def _ports(loaded: Loaded[Sequence]) -> Iterator[Problem]:
    calibrations = {s.name: s for s in loaded.model.steps if isinstance(s, Calibrate)}
    for step, path in _paths(loaded):
        if isinstance(step, Calibrate):
            wanted = 2 if step.method == "SOLT" else 1
            if len(set(step.used_ports)) != wanted:
                yield loaded.document.problem(f"{step.method} calibrates {wanted} port(s), but `ports` names "
                                              f"{list(step.used_ports)}", (*path, "ports"))  # fmt: skip
            if step.isolation and step.method != "SOLT":
                yield loaded.document.problem(f"{step.method} has no isolation to read", (*path, "isolation"))
        if isinstance(step, Judge):
            source = _source(loaded.model, step.from_)
            calibration = calibrations.get(getattr(source, "with_", None) or "")
            one_port = calibration is not None and calibration.method == "SOL"
            for i, limit in enumerate(step.limits):
                two = isinstance(limit, FigureLimit) and limit.kind.ports == 2
                two = two or (isinstance(limit, MaskLimit) and limit.trace != "S11")
                if one_port and two:
                    yield loaded.document.problem(f"{limit.text} needs two ports, but the calibration "
                                                  f"{calibration.name} has one", (*path, "limits", i))  # type: ignore[union-attr]  # fmt: skip


def check_kits(
    loaded: Loaded[Sequence], kits: Mapping[str, Loaded[KitFile]], today: datetime.date
) -> list[Problem]:
    """Kits reach over the sweep, hold the standards, and are not past their date."""
    problems = []
    for step, path in _paths(loaded):
        if not isinstance(step, Calibrate) or step.kit not in kits or step.sweep not in loaded.model.sweeps:
            continue
        kit, grid = kits[step.kit].model, loaded.model.sweeps[step.sweep].grid()
        low, high = kit.frequency
        if grid[0] < low or grid[-1] > high:
            problems.append(loaded.document.problem(
                f"the sweep {step.sweep} covers {_span(grid[0], grid[-1])}, but kit {kit.kit} is defined only for {_span(low, high)}",
                (*path, "kit"), "Use another kit or narrow the sweep."))  # fmt: skip
        lacking = [n for n in METHODS[step.method].standards if n not in kit.standards]
        if lacking:
            problems.append(
                loaded.document.problem(
                    f"kit {kit.kit} lacks {', '.join(lacking)} for {step.method}", (*path, "kit")
                )
            )
        if kit.due and kit.due < today:
            problems.append(loaded.document.problem(f"kit {kit.kit} was due for calibration on {kit.due}", (*path, "kit"),
                                                    "Have it calibrated, or use another kit."))  # fmt: skip
    return problems


def check_masks(loaded: Loaded[Sequence], masks: Mapping[str, Mask]) -> list[Problem]:
    """Masks lie within their sweep."""
    problems = []
    for step, path in _paths(loaded):
        if not isinstance(step, Judge):
            continue
        grid = _grid_of(loaded.model, step.from_)
        for i, limit in enumerate(step.limits):
            if isinstance(limit, MaskLimit) and limit.mask in masks and grid is not None:
                low, high = masks[limit.mask].band
                if low < grid[0] * (1 - 1e-12) or high > grid[-1] * (1 + 1e-12):
                    problems.append(loaded.document.problem(
                        f"mask {limit.mask} covers {_span(low, high)}, but the sweep only {_span(grid[0], grid[-1])}",
                        (*path, "limits", i, "mask"), "Widen the sweep or shorten the mask."))  # fmt: skip
    return problems


def check_bench(loaded: Loaded[Sequence], bench: Bench) -> list[Problem]:
    """Sweeps within the analyzer's range, and power within what unit, port and receiver withstand."""
    problems, sequence, analyzer = [], loaded.model, bench.analyzer
    withstands = [p.withstands.power for p in analyzer.ports.values()]
    for name, sweep in sequence.sweeps.items():
        grid, path = sweep.grid(), ("sweeps", name)

        def add(message: str, key: str, advice: str = "", path: tuple[object, ...] = path) -> None:
            problems.append(loaded.document.problem(message, (*path, key), advice))

        if analyzer.range:
            low, high = analyzer.range.frequency
            if grid[0] < low or grid[-1] > high:
                add(f"sweep {name} covers {_span(grid[0], grid[-1])}, but the analyzer of {bench.bench} only {_span(low, high)}",
                    "to" if grid[-1] > high else "from")  # fmt: skip
            if len(grid) > analyzer.range.points:
                add(
                    f"sweep {name} has {len(grid)} points, the analyzer of {bench.bench} at most {analyzer.range.points}",
                    "points",
                )
            if analyzer.range.power and not analyzer.range.power[0] <= sweep.power <= analyzer.range.power[1]:
                add(
                    f"{sweep.power:g} dBm is outside the analyzer's {analyzer.range.power[0]:g} to {analyzer.range.power[1]:g} dBm",
                    "power",
                )
            if (
                analyzer.range.bandwidth
                and not analyzer.range.bandwidth[0] <= sweep.bandwidth <= analyzer.range.bandwidth[1]
            ):
                add(f"{render(sweep.bandwidth, Dimension.FREQUENCY)} is outside the analyzer's IF bandwidths "
                    f"{_span(*analyzer.range.bandwidth)}", "bandwidth")  # fmt: skip
        if sweep.power > sequence.unit.withstands.power:
            add(f"{sweep.power:g} dBm is more than the unit withstands ({sequence.unit.withstands.power:g} dBm)", "power",
                "Lower the power.")  # fmt: skip
        reaches = sweep.power + max(sequence.unit.gain, 0.0)
        if withstands and reaches > min(withstands):
            add(f"{sweep.power:g} dBm and a gain of {sequence.unit.gain:g} dB bring {reaches:g} dBm to a port that "
                f"withstands {min(withstands):g} dBm", "power", "Lower the power or put a pad before the port.")  # fmt: skip
    return problems
