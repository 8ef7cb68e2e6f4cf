"""Quality of S-parameters and of a 2x-thru, after IEEE 370-2020.

Source: the initial frequency-domain metrics and the fixture electrical requirements as coded in
scikit-rf 2.2.0 (``IEEEP370_FD_QM``, ``IEEEP370_FER``), which cites IEEE 370-2020 and its published code;
the standard's own text was not seen. Grades in per cent, 100 is perfect.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = [
    "FixtureClass",
    "Quality",
    "causality_percent",
    "fixture_class",
    "impedance_class",
    "largest_gain",
    "passivity_percent",
    "quality",
    "reciprocity_percent",
]

_PASSIVE, _RECIPROCAL, _SLOPE = 1.00001, 1e-6, 0.1
_GRADES = ("good", "acceptable", "inconclusive", "poor")
_CAUSAL_ABOVE, _OTHERS_ABOVE = (80.0, 50.0, 20.0), (99.9, 99.0, 80.0)


def largest_gain(two: TwoPort) -> FloatArray:
    r"""Greatest singular value of the scattering matrix, ``(..., f)``, linear.

    For two by two, :math:`\sigma^2 = (t + \sqrt{t^2 - 4 |\det S|^2})/2` with :math:`t = \sum |S_{ij}|^2`.
    """
    t = sum((np.abs(p) ** 2 for p in two.planes), start=np.zeros(1))
    root = np.sqrt(np.maximum(t**2 - 4.0 * np.abs(two.determinant) ** 2, 0.0))
    return np.asarray(np.sqrt((t + root) / 2.0))


def passivity_percent(two: TwoPort) -> float:
    """How far the S-parameters ``(f,)`` are passive: 100 less what the greatest gain exceeds one by."""
    excess = largest_gain(two)
    weight = np.where(excess > _PASSIVE, (excess - _PASSIVE) / _SLOPE, 0.0)
    return _percent(weight)


def reciprocity_percent(two: TwoPort) -> float:
    """How far ``S21`` equals ``S12``, ``(f,)``."""
    gap = np.abs(two.s21 - two.s12)
    weight = np.where(gap > _RECIPROCAL, (gap - _RECIPROCAL) / _SLOPE, 0.0)
    return _percent(weight)


def _percent(weight: FloatArray) -> float:
    return float(100.0 * max(len(weight) - np.sum(weight), 0.0) / len(weight))


def causality_percent(two: TwoPort) -> float:
    """Share of clockwise turning of the S-parameters over frequency, the least of the four planes."""
    return float(min(_clockwise(plane) for plane in two.planes))


def _clockwise(plane: ComplexArray) -> float:
    if np.all(plane == plane[0]):
        return 100.0
    step = np.diff(plane)
    turn = step[1:].real * step[:-1].imag - step[1:].imag * step[:-1].real
    total = float(np.sum(np.abs(turn)))
    return 100.0 * float(np.sum(turn[turn > 0.0])) / total if total > 0.0 else 0.0


@dataclass(frozen=True, slots=True)
class Quality:
    """Initial frequency-domain metrics in per cent, and their grades.

    Examples
    --------
    >>> Quality(85.0, 100.0, 99.5).grades
    {'causality': 'good', 'passivity': 'good', 'reciprocity': 'acceptable'}
    """

    causality: float
    passivity: float
    reciprocity: float

    @property
    def grades(self) -> dict[str, str]:
        """``good``, ``acceptable``, ``inconclusive`` or ``poor`` for each metric."""
        return {
            "causality": _grade(self.causality, _CAUSAL_ABOVE),
            "passivity": _grade(self.passivity, _OTHERS_ABOVE),
            "reciprocity": _grade(self.reciprocity, _OTHERS_ABOVE),
        }

    @property
    def worst(self) -> str:
        """The worst of the three grades."""
        return max(self.grades.values(), key=_GRADES.index)


def _grade(value: float, above: tuple[float, float, float]) -> str:
    return next((g for g, limit in zip(_GRADES[:3], above, strict=True) if value > limit), "poor")


def quality(two: TwoPort) -> Quality:
    """All three metrics of one two-port ``(f,)``, at least three frequencies, evenly spaced."""
    return Quality(causality_percent(two), passivity_percent(two), reciprocity_percent(two))


@dataclass(frozen=True, slots=True)
class FixtureClass:
    """Fixture electrical requirements on a 2x-thru, each with its class ``A``, ``B``, ``C`` or ``none``.

    Parameters
    ----------
    insertion_db
        Least of ``S21`` and ``S12`` in dB (requirement 1).
    reflection_db
        Greatest of ``S11`` and ``S22`` in dB (requirement 2).
    distance_db
        Least of transmission minus reflection in dB (requirement 3).
    """

    insertion_db: float
    reflection_db: float
    distance_db: float

    @property
    def classes(self) -> dict[str, str]:
        """Class by requirement."""
        return {
            "insertion loss": _letter(self.insertion_db, (-10.0, -15.0, -15.0)),
            "return loss": _letter(-self.reflection_db, (20.0, 10.0, 6.0)),
            "loss over reflection": _letter(self.distance_db, (5.0, 0.0, 0.0)),
        }

    @property
    def letter(self) -> str:
        """The worst of them; ``none`` if one is not even C."""
        return max(self.classes.values(), key=("A", "B", "C", "none").index)


def _letter(value: float, least: tuple[float, float, float]) -> str:
    return next((letter for letter, limit in zip("ABC", least, strict=True) if value >= limit), "none")


def fixture_class(two_x_thru: TwoPort) -> FixtureClass:
    """Electrical requirements of a 2x-thru over all its frequencies, in dB."""
    s11, s12, s21, s22 = (20.0 * np.log10(np.maximum(np.abs(p), 1e-15)) for p in two_x_thru.planes)
    return FixtureClass(
        insertion_db=float(min(s21.min(), s12.min())),
        reflection_db=float(max(s11.max(), s22.max())),
        distance_db=float(min((s21 - s11).min(), (s12 - s22).min())),
    )


def impedance_class(reference_ohm: FloatArray, fixture_ohm: FloatArray) -> str:
    """Class by the fixture's impedance along the line against the 2x-thru's (requirement 5).

    Parameters
    ----------
    reference_ohm, fixture_ohm
        Impedance along the fixture half, from the 2x-thru and from fixture, device and fixture, ``(t,)``.

    Returns
    -------
    str
        ``A`` within 2.5 %, ``B`` within 5 %, ``C`` within 10 %, else ``none``.
    """
    off = float(np.max(np.abs(fixture_ohm / reference_ohm - 1.0)))
    return next((k for k, limit in zip("ABC", (0.025, 0.05, 0.10), strict=True) if off <= limit), "none")
