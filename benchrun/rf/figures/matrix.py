"""Figures of the whole matrix: isolation, directivity, symmetry of the ports, passivity."""

from __future__ import annotations

import numpy as np

from benchrun.quantity import Dimension
from benchrun.rf.figures.band import decibels
from benchrun.rf.figures.kind import FigureKind, Parameter
from benchrun.rf.figures.level import transmission
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["KINDS", "greatest_gain"]

_BAND = {
    "over": Parameter("range", Dimension.FREQUENCY, optional=True),
    "at": Parameter("value", Dimension.FREQUENCY, optional=True),
}
_REVERSE = Parameter("choice", default="S12", choices=("S21", "S12"))
_FORWARD = Parameter("choice", default="S21", choices=("S21", "S12"))


def greatest_gain(network: TwoPort) -> FloatArray:
    r"""Greatest singular value of S: the most that any wave can leave with, relative to what it came with.

    A passive part has at most 1 (:math:`I - S^H S` positive semidefinite; any network-theory text). For
    two ports :math:`\sigma^2 = \frac12 (F + \sqrt{F^2 - 4 |\det S|^2})` with F the sum of all squared
    magnitudes; the root is taken as :math:`(F - 2|\det S|)(F + 2|\det S|)`, which never turns negative.

    Returns
    -------
    numpy.ndarray
        ``(..., f)``, linear.
    """
    total = sum((np.abs(p) ** 2 for p in network.planes), np.zeros(()))
    twice = 2.0 * np.abs(network.determinant)
    root = np.sqrt(np.maximum(total - twice, 0.0) * (total + twice))
    return np.asarray(np.sqrt(0.5 * (total + root)))


def _isolation(_f_hz: FloatArray, network: TwoPort, trace: str = "S12") -> FloatArray:
    return -decibels(transmission(network, trace))


def _directivity(_f_hz: FloatArray, network: TwoPort, trace: str = "S21") -> FloatArray:
    other = "S12" if trace == "S21" else "S21"
    return decibels(transmission(network, trace)) - decibels(transmission(network, other))


KINDS = (
    FigureKind(
        "isolation",
        Dimension.RATIO,
        "-20 log10 |S12| (or of the `trace` named) at every sample of the band",
        {**_BAND, "trace": _REVERSE},
        trace=_isolation,
        sense=-1,
    ),
    FigureKind(
        "directivity",
        Dimension.RATIO,
        "20 log10 |S21| less 20 log10 |S12| at every sample of the band: how much better a two-port passes "
        "forwards than backwards (isolation plus gain); not that of a coupler, which takes three ports",
        {**_BAND, "trace": _FORWARD},
        trace=_directivity,
    ),
    FigureKind(
        "port balance",
        Dimension.NUMBER,
        "|S11 - S22| at every sample of the band, linear: 0 for a part that looks the same from both ends",
        _BAND,
        trace=lambda _f_hz, network: np.abs(network.s11 - network.s22),
    ),
    FigureKind(
        "passivity",
        Dimension.NUMBER,
        "greatest singular value of S at every sample of the band, linear: 1 at most for a passive part",
        _BAND,
        trace=lambda _f_hz, network: greatest_gain(network),
    ),
)
