"""Checks of fixture files against the sequence that takes them out."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

import numpy as np

from benchrun.errors import Problem
from benchrun.rf.deembedding.quality import largest_gain
from benchrun.rf.interpolation import resampling_error
from benchrun.rf.touchstone import TouchstoneData
from benchrun.rf.twoport import FloatArray
from benchrun.sequence.files import Loaded
from benchrun.sequence.models import Sequence
from benchrun.sequence.resolve import grid_of, ohm_of, outside, span, step_paths
from benchrun.sequence.steps import DeEmbed, Expect, Judge
from benchrun.sequence.steps.deembed import ohm_text
from benchrun.sequence.steps.judge import FigureLimit

__all__ = ["check_fixtures"]

_COARSE = 1e-3
"""Greatest error that filling in between a file's points may bring, linear."""
_PASSIVE = 1.01
"""Greatest gain of a wave that a file may show; a passive half has none, a measured one a little noise."""


def check_fixtures(
    loaded: Loaded[Sequence], fixtures: Mapping[str, TouchstoneData], z0_ohm: float
) -> list[Problem]:
    """Two ports, the same impedance, reach over the sweep, close enough points, no gain.

    Parameters
    ----------
    loaded
        The sequence.
    fixtures
        By the name that the sequence uses; a name that is not there is not checked.
    z0_ohm
        Reference impedance of the calibration.
    """
    problems: list[Problem] = []
    for step, path in step_paths(loaded):
        if isinstance(step, Judge):
            problems += _judged(loaded, step, path, z0_ohm)
        if isinstance(step, Expect):
            problems += _expected(loaded, step, path, z0_ohm)
        if not isinstance(step, DeEmbed):
            continue
        grid, ohms = grid_of(loaded.model, step.from_), ohm_of(loaded.model, step.from_, z0_ohm)
        problems += [
            loaded.document.problem(t, (*path, k), a) for t, k, a in _of_ports(loaded.model, step, ohms)
        ]
        for key, name in step.files().items():
            if name in fixtures:
                # A dummy may let nothing through; that is what an open or a short one is for.
                joins = key[-1] not in ("open", "short")
                for text, advice in _one(name, fixtures[name], grid, ohms[0].real, joins):
                    problems.append(loaded.document.problem(text, (*path, *key), advice))
    return problems


def _of_ports(
    sequence: Sequence, step: DeEmbed, ohms: tuple[complex, complex]
) -> Iterator[tuple[str, str, str]]:
    """What a step needs of ports and impedances, beside its files."""
    if step.renormalise is None and (ohms[0] != ohms[1] or ohms[0].imag):
        one, two = (ohm_text(z) for z in ohms)
        yield (
            f"{step.from_} is given for {one} on port 1 and {two} on port 2; planes are moved in one real "
            "impedance",
            "from",
            "Renormalise in the last step.",
        )
    if sequence.unit.ports == 2:
        return
    other = (
        "2x-thru" if step.two_thru
        else "dummies" if step.dummies
        else "right" if step.right is not None
        else "shift" if step.shift and len(step.shift) > 1
        else ""
    )  # fmt: skip
    if other:
        yield (
            f"`{other}` needs two ports, but the unit has one",
            other,
            "Use the half of its own port (`left`).",
        )
    if step.renormalise and step.renormalise[0] != step.renormalise[1]:
        yield "names two impedances, but the unit has one port", "renormalise", "Write one."


def _judged(
    loaded: Loaded[Sequence], step: Judge, path: tuple[object, ...], z0_ohm: float
) -> Iterator[Problem]:
    """An impedance needs a real one to refer to."""
    ohms = ohm_of(loaded.model, step.from_, z0_ohm)
    for i, limit in enumerate(step.limits):
        if isinstance(limit, FigureLimit) and "reference" in limit.kind.parameters:
            z = ohms[limit.parameters.get("port", 1) - 1]
            if z.imag:
                yield loaded.document.problem(
                    f"{limit.figure} is told from waves in a real impedance, but {step.from_} is given for "
                    f"{ohm_text(z)}",
                    (*path, "limits", i, "figure"),
                    "Judge it before the step that renormalises.",
                )


def _expected(
    loaded: Loaded[Sequence], step: Expect, path: tuple[object, ...], z0_ohm: float
) -> Iterator[Problem]:
    """A design is compared between its own terminations."""
    ohms = ohm_of(loaded.model, step.from_, z0_ohm)
    for key, wanted, has in zip(
        ("source", "load"), (step.design.source, step.design.load), ohms, strict=True
    ):
        if abs(wanted - has) > 1e-9 * wanted:
            yield loaded.document.problem(
                f"the design has a {key} of {wanted:g} ohm, but {step.from_} is given for {ohm_text(has)}",
                (*path, "design", key),
                "Renormalise the result first.",
            )


def _one(
    name: str, data: TouchstoneData, grid: FloatArray | None, z0: float, joins: bool
) -> Iterator[tuple[str, str]]:
    if data.ports != 2:
        yield f"{name} has one port; a fixture half has two", "Use the two-port file of this half."
        return
    if not np.isclose(data.z0_ohm, z0, rtol=1e-9):
        yield (
            f"{name} is given for {data.z0_ohm:g} ohm, but the result it is taken out of for {z0:g} ohm",
            "Convert the file to that reference impedance.",
        )
    gain = float(np.max(largest_gain(data.two_port)))
    if gain > _PASSIVE:
        yield (
            f"{name} shows a gain of {20 * np.log10(gain):.2f} dB; a fixture half has none",
            "Measure it again.",
        )
    if joins and float(np.min(np.abs(data.s[:, 1, 0] * data.s[:, 0, 1]))) < 1e-6:
        yield f"{name} lets next to nothing through, so nothing behind it can be found", "Use the right file."
    if grid is None:
        return
    first, last = data.f_hz[0], data.f_hz[-1]
    if outside(grid[0], grid[-1], data.f_hz):
        yield (
            f"{name} covers {span(first, last)}, but the sweep {span(grid[0], grid[-1])}",
            "Use a file that reaches over the sweep, or narrow the sweep.",
        )
    elif not np.array_equal(grid, data.f_hz):
        planes = (data.s[:, i, j] for i in (0, 1) for j in (0, 1))
        error = max(resampling_error(data.f_hz, plane, grid) for plane in planes)
        if error > _COARSE:
            yield (
                f"{name} has {len(data.f_hz)} points, too few to fill in between: "
                f"the error may reach {error:.1e}",
                "Use a file with closer points, best on the sweep's own frequencies.",
            )
