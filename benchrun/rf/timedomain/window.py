"""Windows: what a cut-off band does to a response in time, traded against its width."""

from __future__ import annotations

import functools
from collections.abc import Callable, Mapping

import numpy as np

from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["KAISER_BETA", "WINDOWS", "turns", "window"]

KAISER_BETA = 6.0
"""Side lobes 44 dB down, main lobe 2.16 steps from its middle to its first null (Kaiser and Schafer, 1980,
from memory)."""

WINDOWS: Mapping[str, Callable[[int], FloatArray]] = {
    "rectangular": lambda n: np.ones(n),
    "Hann": lambda n: np.hanning(n + 2)[1:-1],  # without its zeros: no sample is thrown away
    "Hamming": lambda n: np.hamming(n),
    "Kaiser": lambda n: np.kaiser(n, KAISER_BETA),
}
"""By their inventors' names; each symmetric, ``n -> (n,)``."""


@functools.lru_cache(16)
def _whole(name: str, points: int) -> FloatArray:
    # Many traces of one sweep want the same window, and Bessel functions take longer than the transform.
    weight = np.asarray(WINDOWS[name](points))
    weight.setflags(write=False)
    return weight


def window(name: str, points: int, low_pass: bool = False) -> FloatArray:
    """Weights of the samples of a sweep.

    Parameters
    ----------
    name
        A key of :data:`WINDOWS`.
    points
        Samples; with ``low_pass`` that at 0 Hz included.
    low_pass
        The upper half of a window whose middle is 0 Hz, where the weight is then 1.

    Returns
    -------
    numpy.ndarray
        ``(points,)``.

    Raises
    ------
    ValueError
        For a name that is no window.
    """
    if name not in WINDOWS:
        raise ValueError(f"{name!r} is no window; known are {', '.join(WINDOWS)}")
    if not low_pass:
        return _whole(name, points)
    half = _whole(name, 2 * points - 1)[points - 1 :]
    return np.asarray(half / half[0])


def turns(angle: float, first: float, points: int) -> ComplexArray:
    """``exp(i angle (first + k))`` for k from 0, ``(points,)``, to about 1e-13.

    Each is the product of one of a few coarse and one of a few fine turns, a tenth of the work.
    """
    block = int(np.ceil(np.sqrt(points)))
    fine = np.exp(1j * angle * np.arange(block))
    coarse = np.exp(1j * angle * (first + block * np.arange(-(-points // block))))
    return np.asarray((coarse[:, np.newaxis] * fine).ravel()[:points])
