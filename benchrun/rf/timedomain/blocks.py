"""Many draws a block at a time, so that transforms of all of them never stand in memory at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["by_rows"]

_SAMPLES = 1 << 20
"""Samples of time held at once: 16 MB as complex numbers."""


def by_rows(
    plane: ComplexArray, count: int, function: Callable[[ComplexArray], tuple[FloatArray, FloatArray]]
) -> tuple[FloatArray, FloatArray]:
    """Apply a function to blocks of rows.

    Parameters
    ----------
    plane
        ``(..., n)``.
    count
        Samples that the function holds for each row.
    function
        ``(d, n) -> two arrays (d,)``.

    Returns
    -------
    tuple of numpy.ndarray
        ``(...,)`` each.
    """
    flat = plane.reshape(-1, plane.shape[-1])
    rows = max(_SAMPLES // count, 1)
    first, second = np.empty(len(flat)), np.empty(len(flat))
    for start in range(0, len(flat), rows):
        first[start : start + rows], second[start : start + rows] = function(flat[start : start + rows])
    return first.reshape(plane.shape[:-1]), second.reshape(plane.shape[:-1])
