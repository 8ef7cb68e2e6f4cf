"""What a step leaves for the next: S-parameters on a grid, with the variations that carry uncertainty."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

import numpy as np

from benchrun.rf.tone import Tone
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort
from benchrun.uncertainty.decision import COVERAGE_FACTOR

__all__ = ["Data", "Network", "combine"]

Data: TypeAlias = TwoPort | ComplexArray | Tone
"""A two-port, or the reflection of a one-port, planes of shape ``(..., f)``; or a tone's levels."""


@dataclass(frozen=True, slots=True, eq=False)
class Network:
    """Measured S-parameters.

    Parameters
    ----------
    f_hz
        Frequencies in Hz, shape ``(f,)``.
    nominal
        The measured values: planes of shape ``(f,)``.
    varied
        The same values under each variation of what is uncertain: planes of shape ``(v, f)``; None
        where nothing is declared about uncertainty.
    systematic
        How many rows of ``varied`` are one-standard-uncertainty steps; the rest are draws of noise.
    z0_ohm
        Real reference impedance of both ports.
    ports_ohm
        Reference impedance of each port where they differ or are complex; ``z0_ohm`` then means nothing.
    """

    f_hz: FloatArray
    nominal: Data
    varied: Data | None = None
    systematic: int = 0
    z0_ohm: float = 50.0
    ports_ohm: tuple[complex, complex] | None = None

    def impedance(self, port: int) -> complex:
        """Reference impedance of a port in ohms."""
        return complex(self.z0_ohm) if self.ports_ohm is None else self.ports_ohm[port - 1]

    @property
    def ports(self) -> int:
        """1 or 2."""
        return 2 if isinstance(self.nominal, TwoPort) else 1

    @property
    def matrix(self) -> ComplexArray:
        """Nominal values as ``(f, n, n)``."""
        if isinstance(self.nominal, TwoPort):
            return self.nominal.matrix
        if isinstance(self.nominal, Tone):
            raise TypeError("a tone has no S-parameters")
        return self.nominal[:, np.newaxis, np.newaxis]

    def plane(self, name: str) -> tuple[ComplexArray, ComplexArray | None]:
        """One parameter, nominal ``(f,)`` and varied ``(v, f)``; of a one-port only its reflection.

        Raises
        ------
        KeyError
            For a parameter that the network does not have.
        """
        if isinstance(self.nominal, TwoPort):
            varied = self.varied.parameter(name) if isinstance(self.varied, TwoPort) else None
            return self.nominal.parameter(name), varied
        if name not in ("S11", "S22") or isinstance(self.nominal, Tone):
            raise KeyError(name)
        return self.nominal, None if self.varied is None else np.asarray(self.varied, np.complex128)

    def expanded(self, name: str) -> FloatArray:
        """Expanded uncertainty of one parameter as a complex number, linear, ``(f,)``.

        The radius k times the root of both components' variances: the true value lies within it of the
        measured one with at least the coverage that k = 2 gives one component.

        Raises
        ------
        KeyError
            For a parameter that the network does not have.
        ValueError
            If nothing is declared about uncertainty.
        """
        nominal, varied = self.plane(name)
        if varied is None:
            raise ValueError("nothing is declared about uncertainty")
        spread = varied - nominal
        real, imaginary = combine(spread.real, self.systematic), combine(spread.imag, self.systematic)
        return np.asarray(COVERAGE_FACTOR * np.hypot(real, imaginary))


def combine(spread: FloatArray, systematic: int) -> FloatArray:
    """Combine variations into one standard uncertainty.

    Parameters
    ----------
    spread
        Differences from the nominal value, shape ``(v, ...)``. The first ``systematic`` rows are
        one-standard-uncertainty steps of independent influences, the rest are random draws of noise.
    systematic
        How many rows are steps.

    Returns
    -------
    numpy.ndarray
        Standard uncertainty, shape ``(...)``: root of the summed squares of the steps (GUM:1995, 5.1.2,
        numerically after 5.1.3 note 2) and the mean square of the draws.

    Examples
    --------
    >>> import numpy as np
    >>> float(combine(np.array([3.0, 4.0]), 2))
    5.0
    """
    total = np.sum(spread[:systematic] ** 2, axis=0)
    if len(spread) > systematic:
        total = total + np.mean(spread[systematic:] ** 2, axis=0)
    return np.asarray(np.sqrt(total), dtype=np.float64)
