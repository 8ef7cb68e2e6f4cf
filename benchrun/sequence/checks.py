"""Whole-file checks of a sequence by itself: names, order, bands, ports, the serial number.

What depends on kits, masks and the bench is checked in :mod:`benchrun.sequence.equipment`, offered here too.
"""

from __future__ import annotations

import re
from collections.abc import Iterator

import numpy as np

from benchrun.errors import InputError, Problem
from benchrun.quantity import Dimension, render
from benchrun.rf.twoport import FloatArray
from benchrun.sequence.equipment import check_bench, check_masks
from benchrun.sequence.files import Loaded
from benchrun.sequence.kits import check_kits
from benchrun.sequence.loading import Document
from benchrun.sequence.models import Sequence
from benchrun.sequence.resolve import grid_of, outside, source_of, span, step_paths
from benchrun.sequence.steps import Calibrate, DeEmbed, Expect, Judge, StepModel, Tone
from benchrun.sequence.steps.judge import FigureLimit, MaskLimit

__all__ = ["check_bench", "check_kits", "check_masks", "check_sequence", "check_serial"]

_SAFE_SERIAL = re.compile(r"[A-Za-z0-9][A-Za-z0-9._+-]{0,63}")


def check_serial(serial: str, sequence: Sequence) -> str:
    """Return a serial number that fits, or refuse it.

    Raises
    ------
    InputError
        If it does not match the sequence's pattern, or could be a path or an instrument message.
    """
    if not _SAFE_SERIAL.fullmatch(serial) or ".." in serial:
        raise InputError(
            f"serial number {serial!r} holds characters that no serial number may hold; allowed are letters, "
            "digits and . _ + - (at most 64, beginning with a letter or digit)"
        )
    if not re.fullmatch(sequence.unit.serial, serial):
        raise InputError(
            f"serial number {serial!r} does not match the pattern {sequence.unit.serial!r} "
            f"of {sequence.sequence}; read the label once more"
        )
    return serial


def check_sequence(loaded: Loaded[Sequence]) -> list[Problem]:
    """Names, order, limits inside sweeps, apertures: all that the sequence alone can tell."""
    return [*_names(loaded), *_bands(loaded), *_ports(loaded)]


def _names(loaded: Loaded[Sequence]) -> Iterator[Problem]:
    document, sequence = loaded.document, loaded.model
    standing: dict[tuple[str, str], int] = {("sweep", name): -1 for name in sequence.sweeps}
    later = {(step.leaves, step.name): i for i, step in enumerate(sequence.steps)}
    taken: dict[str, int] = {}
    for index, (step, path) in enumerate(step_paths(loaded)):
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
                yield document.problem(
                    f"`{key}: {name}` names no {kind} that stands before this step",
                    (*path, key),
                    f"Standing here: {known}.",
                )
        if step.name in taken:
            yield document.problem(
                f"the name {step.name!r} is used by step {taken[step.name] + 1} already",
                (*path, "as"),
                "Give each step its own name.",
            )
        taken.setdefault(step.name, index)
        standing[step.leaves, step.name] = index
    if not any(isinstance(step, Judge | Expect) for step in sequence.steps):
        yield document.problem(
            "has no step that judges, so nothing could ever be concluded",
            ("steps",),
            "Add a `judge` step.",
            key=True,
        )


def _bands(loaded: Loaded[Sequence]) -> Iterator[Problem]:
    for step, path in step_paths(loaded):
        if not isinstance(step, Judge | Expect):
            continue
        grid = grid_of(loaded.model, step.from_)
        if grid is None:
            continue
        if isinstance(step, Expect):
            yield from _expected_band(loaded.document, step, path, grid)
            continue
        for i, limit in enumerate(step.limits):
            if isinstance(limit, FigureLimit):
                yield from _figure_band(loaded, limit, (*path, "limits", i), grid)


def _expected_band(
    document: Document, step: Expect, path: tuple[object, ...], grid: FloatArray
) -> Iterator[Problem]:
    low, high = step.over
    if outside(low, high, grid):
        swept = span(grid[0], grid[-1])
        yield document.problem(
            f"the design is expected over {span(low, high)}, but the sweep covers {swept}",
            (*path, "over"),
            "Widen the sweep or narrow the band.",
        )
    elif np.count_nonzero((grid >= low) & (grid <= high)) < 2:
        yield document.problem(
            f"the sweep has fewer than two points in {span(low, high)}", (*path, "over"), "Use more points."
        )


def _figure_band(
    loaded: Loaded[Sequence], limit: FigureLimit, path: tuple[object, ...], grid: FloatArray
) -> Iterator[Problem]:
    band, document, swept = limit.kind.band(limit.parameters), loaded.document, span(grid[0], grid[-1])
    spans = [(band, "over" if limit.over else "at")] if band else []
    if limit.against:
        spans.append((limit.against, "against"))
    for (low, high), key in spans:
        if outside(low, high, grid):
            reach = " (half an aperture included)" if limit.kind.reach_hz and key != "against" else ""
            yield document.problem(
                f"{limit.figure} looks at {span(low, high)}{reach}, but the sweep covers {swept}",
                (*path, key),
                "Widen the sweep or narrow the band.",
            )
    if limit.kind.dimension is Dimension.FREQUENCY and not limit.kind.width:
        for side, value in limit.bounds.items():
            if outside(value, value, grid):
                yield document.problem(
                    f"`{side}`: {render(value, Dimension.FREQUENCY)} lies outside the sweep, "
                    f"which covers {swept}",
                    (*path, side),
                    "Widen the sweep or correct the limit.",
                )
    if limit.aperture is not None and band:
        first = max(int(np.searchsorted(grid, band[0], "right")) - 1, 0)
        last = min(int(np.searchsorted(grid, band[1], "left")), len(grid) - 1)
        step_hz = float(np.max(np.diff(grid[first : last + 1]), initial=0.0))
        if limit.aperture < step_hz:
            yield document.problem(
                f"the aperture {render(limit.aperture, Dimension.FREQUENCY)} is narrower "
                f"than the sweep's step of {render(step_hz, Dimension.FREQUENCY)}",
                (*path, "aperture"),
                "Use more points or a wider aperture.",
            )


def _ports(loaded: Loaded[Sequence]) -> Iterator[Problem]:
    document = loaded.document
    calibrations = {s.name: s for s in loaded.model.steps if isinstance(s, Calibrate)}
    for step, path in step_paths(loaded):
        if isinstance(step, Calibrate):
            wanted = 2 if step.how.two_port else 1
            if len(step.used_ports) != wanted or len(set(step.used_ports)) != wanted:
                yield document.problem(
                    f"{step.method} calibrates {wanted} port(s), but `ports` names {list(step.used_ports)}",
                    (*path, "ports"),
                    f"Write {'[1, 2]' if wanted == 2 else '[1] or [2]'}.",
                )
            yield from _options(document, step, path)
            if step.isolation and not step.how.two_port:
                yield document.problem(
                    f"{step.method} has no isolation to read", (*path, "isolation"), "Take `isolation` out."
                )
        if isinstance(step, DeEmbed) and isinstance(source_of(loaded.model, step.from_), Tone):
            yield document.problem(
                f"{step.from_} is a tone, which has no S-parameters to take a fixture out of", (*path, "from")
            )
        if isinstance(step, Expect):
            yield from _expectable(loaded, step, path)
        if isinstance(step, Judge):
            source = source_of(loaded.model, step.from_)
            yield from _domains(document, step, path, source)
            if isinstance(source, Tone):
                continue
            calibration = calibrations.get(getattr(source, "with_", None) or "")
            if loaded.model.unit.ports == 1:
                has, one = "the unit", 1
            elif calibration is not None and not calibration.how.two_port and calibration.used_ports:
                has, one = f"the calibration {calibration.name}", calibration.used_ports[0]
            else:
                continue
            for i, limit in enumerate(step.limits):
                yield from _one_port(document, limit, (*path, "limits", i), has, one)


def _expectable(loaded: Loaded[Sequence], step: Expect, path: tuple[object, ...]) -> Iterator[Problem]:
    """A design is of S-parameters between its own terminations."""
    document, source = loaded.document, source_of(loaded.model, step.from_)
    if isinstance(source, Tone):
        yield document.problem(f"{step.from_} is a tone, which no ladder predicts", (*path, "from"))
    elif loaded.model.unit.ports == 1:
        yield document.problem("a ladder has two ports, but the unit has one", path)


def _options(document: Document, step: Calibrate, path: tuple[object, ...]) -> Iterator[Problem]:
    """Options that the method does not know are a misunderstanding, not a detail."""
    lines = ("lines", "reflect", "beyond window")
    known: dict[str, tuple[str, ...]] = {"TRL": lines, "multiline TRL": lines, "LRM": ("reflect",)}
    for key, given in (("lines", step.lines != ("line",)), ("reflect", step.reflect != "short"),
                       ("beyond window", step.beyond_window)):  # fmt: skip
        if given and key not in known.get(step.method, ()):
            yield document.problem(f"`{key}` means nothing for {step.method}", (*path, key), "Take it out.")


def _domains(
    document: Document, step: Judge, path: tuple[object, ...], source: StepModel | None
) -> Iterator[Problem]:
    """Figures of a tone are taken from a tone, all others from a sweep."""
    if source is None:
        return
    has = "tone" if isinstance(source, Tone) else "sweep"
    for i, limit in enumerate(step.limits):
        wants = "sweep" if isinstance(limit, MaskLimit) else limit.kind.domain
        if wants != has:
            yield document.problem(
                f"{limit.text} is taken from a {wants}, but {step.from_} is a {has}",
                (*path, "limits", i),
                f"Judge it in a step whose `from` names a {wants}.",
            )
        elif (
            isinstance(source, Tone)
            and isinstance(limit, FigureLimit)
            and limit.figure == "harmonic level"
            and source.harmonics < 2
        ):
            yield document.problem(
                f"{source.name} reads no harmonics",
                (*path, "limits", i),
                "Write `harmonics: 3` in that step.",
            )


def _one_port(
    document: Document, limit: FigureLimit | MaskLimit, path: tuple[object, ...], has: str, one: int
) -> Iterator[Problem]:
    trace = f"S{one}{one}"
    if isinstance(limit, MaskLimit):
        two, wrong = limit.trace[1] != limit.trace[2], limit.trace != trace
    else:
        two, wrong = limit.kind.ports == 2, limit.parameters.get("port", one) != one
    if two:
        yield document.problem(
            f"{limit.text} needs two ports, but {has} has one", path, f"Judge the reflection {trace} instead."
        )
    elif wrong:
        key = "trace" if isinstance(limit, MaskLimit) else "port"
        yield document.problem(
            f"{limit.text} is not of port {one}, the only one that {has} has",
            (*path, key),
            f"Write port {one}.",
        )
