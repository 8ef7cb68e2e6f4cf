"""Checks of kits: by themselves with their measured standards, and against the sequence that uses them."""

from __future__ import annotations

import datetime
from collections.abc import Iterator, Mapping

import numpy as np

from benchrun.errors import InvalidMeasurement, Problem
from benchrun.quantity import Dimension, render
from benchrun.rf.calibration import define
from benchrun.rf.calibration.lines import WINDOW_DEG, guesses_of, report_of
from benchrun.rf.kit import Kit
from benchrun.rf.touchstone import TouchstoneData
from benchrun.rf.twoport import FloatArray
from benchrun.sequence.bench import Bench
from benchrun.sequence.files import Loaded
from benchrun.sequence.kit import KitFile
from benchrun.sequence.models import Sequence
from benchrun.sequence.resolve import outside, span, step_paths
from benchrun.sequence.steps import Calibrate

__all__ = ["check_connectors", "check_kits", "check_standards"]

_ALIKE_DEG = 2.0
"""Lines whose phases differ by less over the whole sweep count as one length."""
_PASSIVE = 1.01


def check_standards(loaded: Loaded[KitFile], files: Mapping[str, TouchstoneData]) -> list[Problem]:
    """Measured standards: ports, impedance, no gain, and the range of the kit.

    Parameters
    ----------
    loaded
        The kit.
    files
        By the name that the kit uses; a name that is not there is not checked.
    """
    kit, problems = loaded.model, []
    for name, one in kit.standards.items():
        if one.file is None or one.file not in files:
            continue
        for text, advice in _standard(kit, str(name), one.kind, files[one.file]):
            problems.append(loaded.document.problem(text, ("standards", name, "file"), advice))
    return problems


def _standard(kit: KitFile, name: str, kind: str, data: TouchstoneData) -> Iterator[tuple[str, str]]:
    wanted = 2 if kind in ("thru", "line") else 1
    if data.ports != wanted:
        yield f"a {kind} has {wanted} port(s), but the file of {name} has {data.ports}", "Name its own file."
    if not np.isclose(data.z0_ohm, kit.impedance, rtol=1e-9):
        yield (
            f"{name} was measured in {data.z0_ohm:g} ohm, but the kit is of {kit.impedance:g} ohm",
            "Convert the file to the kit's impedance.",
        )
    if outside(*kit.frequency, data.f_hz):
        yield (
            f"{name} was measured from {span(data.f_hz[0], data.f_hz[-1])}, but the kit promises "
            f"{span(*kit.frequency)}",
            "Narrow `frequency` to what was measured.",
        )
    most = float(np.max(np.abs(data.s)))
    if most > _PASSIVE:
        yield (
            f"{name} shows {most:.3f} times the wave it gets; a standard has no gain",
            "Have it measured again.",
        )


def check_kits(
    loaded: Loaded[Sequence],
    kits: Mapping[str, Loaded[KitFile]],
    today: datetime.date,
    files: Mapping[str, Mapping[str, TouchstoneData]] | None = None,
) -> list[Problem]:
    """Check that kits reach over the sweep, serve the method, and are not past their date.

    Parameters
    ----------
    loaded
        The sequence.
    kits
        By the name that the sequence uses; a name that is not there is not checked.
    today
        A kit is good on the day it is due.
    files
        Measured standards by kit and name.
    """
    problems = []
    for step, path in step_paths(loaded):
        if not isinstance(step, Calibrate) or step.kit not in kits or step.sweep not in loaded.model.sweeps:
            continue
        kit, grid = kits[step.kit].model, loaded.model.sweeps[step.sweep].grid()
        measured = (files or {}).get(step.kit, {})
        said = list(_kit(step, kit, grid, today))
        if not said and set(kit.files().values()) <= set(measured):
            said += _lines(step, kit.build(measured), grid)
        problems += [loaded.document.problem(text, (*path, key), advice) for text, key, advice in said]
    return problems


def check_connectors(
    loaded: Loaded[Sequence], kits: Mapping[str, Loaded[KitFile]], bench: Bench
) -> list[Problem]:
    """Check that each kit is of the connector family of the ports it calibrates, where both say so."""
    problems = []
    for step, path in step_paths(loaded):
        if not isinstance(step, Calibrate) or step.kit not in kits or "analyzer" not in bench.instruments:
            continue
        kit = kits[step.kit].model
        for port in step.used_ports:
            has = bench.analyzer.ports[port].connector if port in bench.analyzer.ports else ""
            family = has.split(",")[0].strip()
            if family and kit.family and family.casefold() != kit.family.casefold():
                problems.append(
                    loaded.document.problem(
                        f"kit {kit.kit} is {kit.family}, but port {port} of {bench.bench} is {family}",
                        (*path, "kit"),
                        "Use a kit of that family; an adapter between them is not calibrated out.",
                    )
                )
    return problems


def _kit(
    step: Calibrate, kit: KitFile, grid: FloatArray, today: datetime.date
) -> Iterator[tuple[str, str, str]]:
    low, high = kit.frequency
    if outside(grid[0], grid[-1], np.array([low, high])):
        yield (
            f"the sweep {step.sweep} covers {span(grid[0], grid[-1])}, but kit {kit.kit} is defined "
            f"only for {span(low, high)}",
            "kit",
            "Use another kit or narrow the sweep.",
        )
    lacking = [n for n in step.how.takes(step.options) if n not in kit.standards]
    if lacking:
        yield f"kit {kit.kit} lacks {', '.join(lacking)} for {step.method}", "kit", "Use another kit."
    past = kit.due is not None and kit.due < today
    if past and step.overrule is None:
        yield (
            f"kit {kit.kit} was due for calibration on {kit.due}",
            "kit",
            'Have it calibrated, use another kit, or overrule it in writing: `overrule: "reason"`.',
        )
    if not past and step.overrule is not None:
        yield (
            f"kit {kit.kit} is not past its date ({kit.due or 'it has none'}): there is nothing to overrule",
            "overrule",
            "Take `overrule` out; it must not stand there in advance.",
        )


def _lines(step: Calibrate, kit: Kit, grid: FloatArray) -> Iterator[tuple[str, str, str]]:
    """What the definitions of lines tell before any of them is connected."""
    if "TRL" not in step.method:
        return
    try:
        guesses = guesses_of(define(kit, step.how.takes(step.options), grid), step.options)[0]
    except InvalidMeasurement as error:
        yield error.reason, "lines", error.advice
        return
    names = tuple(guesses)
    angles = np.array([np.angle(guesses[name]) for name in names])
    for i, name in enumerate(names):
        others = [("thru", np.zeros_like(grid)), *((n, angles[j]) for j, n in enumerate(names[:i]))]
        for other, angle in others:
            if np.max(np.abs(np.angle(np.exp(1j * (angles[i] - angle))))) < np.radians(_ALIKE_DEG):
                yield (
                    f"{other} and {name} are of one length within {_ALIKE_DEG:g} degrees all over the sweep",
                    "lines",
                    "Use lines of different lengths.",
                )
                return
    report = report_of(names, np.degrees(np.abs(angles)))
    if step.beyond_window or report.within.all():
        return
    low, high = WINDOW_DEG
    bad = grid[~report.within]
    worst = int(np.argmax(np.abs(report.best_deg - 90.0)))
    yield (
        f"no line is {low:g} to {high:g} degrees longer than the thru at {len(bad)} of {len(grid)} points "
        f"between {_hz(bad[0])} and {_hz(bad[-1])}; the worst is {names[report.chosen[worst]]} with "
        f"{report.best_deg[worst]:.1f} degrees at {_hz(grid[worst])}",
        "lines" if step.lines != ("line",) else "sweep",
        "Narrow the sweep, add a line of another length, or write `beyond window: true`.",
    )


def _hz(value: float) -> str:
    return render(float(value), Dimension.FREQUENCY)
