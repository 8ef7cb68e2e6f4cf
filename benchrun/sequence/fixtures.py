"""Checks of fixture files against the sequence that takes them out."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

import numpy as np

from benchrun.errors import Problem
from benchrun.rf.interpolation import resampling_error
from benchrun.rf.touchstone import TouchstoneData
from benchrun.rf.twoport import FloatArray
from benchrun.sequence.files import Loaded
from benchrun.sequence.models import Sequence
from benchrun.sequence.resolve import grid_of, outside, span, step_paths
from benchrun.sequence.steps import DeEmbed

__all__ = ["check_fixtures"]

_COARSE = 1e-3
"""Greatest error that filling in between a file's points may bring, linear."""
_PASSIVE = 1.02
"""Greatest gain in power that a file may show; a passive half has none, a measured one a little noise."""


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
    problems = []
    for step, path in step_paths(loaded):
        if not isinstance(step, DeEmbed):
            continue
        grid = grid_of(loaded.model, step.from_)
        for key, name in (("left", step.left), ("right", step.right)):
            if name in fixtures:
                for text, advice in _one(str(name), fixtures[str(name)], grid, z0_ohm):
                    problems.append(loaded.document.problem(text, (*path, key), advice))
    return problems


def _one(name: str, data: TouchstoneData, grid: FloatArray | None, z0: float) -> Iterator[tuple[str, str]]:
    if data.ports != 2:
        yield f"{name} has one port; a fixture half has two", "Use the two-port file of this half."
        return
    if not np.isclose(data.z0_ohm, z0, rtol=1e-9):
        yield (
            f"{name} is given for {data.z0_ohm:g} ohm, but the calibration is for {z0:g} ohm",
            "Convert the file to the calibration's reference impedance.",
        )
    gain = float(np.max(np.abs(data.s) ** 2))
    if gain > _PASSIVE:
        yield (
            f"{name} shows a gain of {10 * np.log10(gain):.2f} dB; a fixture half has none",
            "Measure it again.",
        )
    if float(np.min(np.abs(data.s[:, 1, 0] * data.s[:, 0, 1]))) < 1e-6:
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
