"""Named distributions: what a declared size means, and draws of it.

A scalar influence has one draw, a vector one two: the real and imaginary part of a complex number, drawn
together, never as a magnitude and a phase of their own. All draws have unit standard deviation on each axis;
:meth:`Distribution.standard` says what a declared size is worth on that scale.

Sources: JCGM 101:2008, table 1 and 6.4 (from memory); GUM:1995, 4.3.7 to 4.3.9 (from memory).
"""

from __future__ import annotations

import math
from enum import StrEnum

import numpy as np

from benchrun.rf.twoport import FloatArray

__all__ = ["Distribution"]


class Distribution(StrEnum):
    """How the values of an influence scatter."""

    NORMAL = "normal"
    RECTANGULAR = "rectangular"
    U_SHAPED = "U-shaped"

    def standard(self, size: float, vector: bool = False) -> float:
        """Standard uncertainty of one axis for a declared size.

        Parameters
        ----------
        size
            Normal: the standard deviation (of a vector: root mean square of its magnitude). Rectangular: half
            the width (the radius of a disk). U-shaped: the amplitude (the magnitude, its phase unknown).
        vector
            Whether it is a complex number.

        Examples
        --------
        >>> round(Distribution.RECTANGULAR.standard(1.0), 4)
        0.5774
        >>> round(Distribution.U_SHAPED.standard(0.01, vector=True), 5)
        0.00707
        >>> Distribution.RECTANGULAR.standard(1.0, vector=True)
        0.5
        """
        divisor = {
            (Distribution.NORMAL, False): 1.0,
            (Distribution.NORMAL, True): math.sqrt(2.0),
            (Distribution.RECTANGULAR, False): math.sqrt(3.0),
            (Distribution.RECTANGULAR, True): 2.0,
            (Distribution.U_SHAPED, False): math.sqrt(2.0),
            (Distribution.U_SHAPED, True): math.sqrt(2.0),
        }
        return abs(size) / divisor[self, vector]

    def draw(self, generator: np.random.Generator, trials: int, vector: bool = False) -> FloatArray:
        """Draws of unit standard deviation on each axis.

        Parameters
        ----------
        generator
            Chance.
        trials
            How many.
        vector
            Two axes drawn together.

        Returns
        -------
        numpy.ndarray
            ``(trials, 1)``, or ``(trials, 2)`` for a vector.
        """
        axes = 2 if vector else 1
        if self is Distribution.NORMAL:
            return generator.standard_normal((trials, axes))
        if not vector:
            u = generator.random((trials, 1))
            if self is Distribution.RECTANGULAR:
                return np.asarray(math.sqrt(12.0) * (u - 0.5))
            return np.asarray(math.sqrt(2.0) * np.cos(2.0 * np.pi * u))
        u = generator.random((trials, 2))
        radius = np.full(trials, math.sqrt(2.0)) if self is Distribution.U_SHAPED else 2.0 * np.sqrt(u[:, 1])
        angle = 2.0 * np.pi * u[:, 0]
        return np.stack([radius * np.cos(angle), radius * np.sin(angle)], axis=-1)
