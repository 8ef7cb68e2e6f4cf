"""Fixture halves from a 2x-thru, after IEEE 370-2020, without and with impedance correction.

Computed by scikit-rf (``IEEEP370_SE_NZC_2xThru`` and ``IEEEP370_SE_ZC_2xThru``), which follows the code that
goes with the standard. *NZC* needs the 2x-thru alone and takes the fixture in front of the unit for exactly
its halves; *ZC* also reads fixture, unit and fixture, and follows their impedance along the line.
"""

from __future__ import annotations

import warnings
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.rf.deembedding.halves import refuse_active, without
from benchrun.rf.deembedding.quality import FixtureClass, Quality, fixture_class, quality
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["SELF_TEST", "SelfTest", "Split", "split_nzc", "split_zc"]

SELF_TEST = (0.1, 1.0)
"""Residual that the standard allows when the 2x-thru is taken out of itself: dB and degrees (from memory)."""


@dataclass(frozen=True, slots=True)
class SelfTest:
    """What is left of a 2x-thru when its own halves are taken out: greatest values over frequency."""

    magnitude_db: float
    phase_deg: float

    @property
    def good(self) -> bool:
        """Whether both are within :data:`SELF_TEST`."""
        return self.magnitude_db <= SELF_TEST[0] and self.phase_deg <= SELF_TEST[1]


@dataclass(frozen=True, slots=True, eq=False)
class Split:
    """Halves of a 2x-thru, and how good it was.

    Parameters
    ----------
    left, right
        ``(f,)`` each; the left one has its port 2 at the unit, the right one its port 1.
    method
        ``"NZC"`` or ``"ZC"``.
    quality
        Of the 2x-thru.
    fixture
        Electrical class of the 2x-thru.
    self_test
        Residual of the 2x-thru without its halves.
    resampled
        Whether the halves were found on another grid than the data's, since that did not start at its step.
    """

    left: TwoPort
    right: TwoPort
    method: Literal["NZC", "ZC"]
    quality: Quality
    fixture: FixtureClass
    self_test: SelfTest
    resampled: bool

    def without(self, reading: TwoPort) -> TwoPort:
        """Take both halves out of a reading on the same grid."""
        return without(reading, self.left, self.right)


def split_nzc(f_hz: FloatArray, two_x_thru: TwoPort, z0_ohm: float = 50.0) -> Split:
    """Split a 2x-thru into its halves, without impedance correction.

    Parameters
    ----------
    f_hz
        ``(f,)``, evenly spaced, best starting at its own step.
    two_x_thru
        ``(f,)``.
    z0_ohm
        Reference impedance, real.

    Raises
    ------
    InvalidMeasurement
        If the 2x-thru is not passive, lets nothing through, or is too short for the span.
    """
    from skrf.calibration.deembedding import IEEEP370_SE_NZC_2xThru

    resampled = _refuse(f_hz, two_x_thru)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # it says that it resamples; so does our result
        solved = IEEEP370_SE_NZC_2xThru(_network(f_hz, two_x_thru, z0_ohm), z0=z0_ohm)
    return _split(solved, "NZC", two_x_thru, resampled)


def split_zc(
    f_hz: FloatArray,
    two_x_thru: TwoPort,
    fixture_unit_fixture: TwoPort,
    z0_ohm: float = 50.0,
    fit_to_hz: float = 0.0,
) -> Split:
    """Split a 2x-thru, and follow the impedance along fixture, unit and fixture.

    Parameters
    ----------
    f_hz, two_x_thru, z0_ohm
        As for :func:`split_nzc`.
    fixture_unit_fixture
        The reading from which the halves will be taken, ``(f,)``.
    fit_to_hz
        Fit the loss up to this frequency; 0 takes it as it is read.

    Raises
    ------
    InvalidMeasurement
        As for :func:`split_nzc`.
    """
    from skrf.calibration.deembedding import IEEEP370_SE_ZC_2xThru

    resampled = _refuse(f_hz, two_x_thru)
    _refuse_numbers(fixture_unit_fixture, "reading of fixture, unit and fixture")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        solved = IEEEP370_SE_ZC_2xThru(
            _network(f_hz, two_x_thru, z0_ohm),
            _network(f_hz, fixture_unit_fixture, z0_ohm),
            z0=z0_ohm,
            bandwidth_limit=fit_to_hz,
        )
    return _split(solved, "ZC", two_x_thru, resampled)


def _network(f_hz: FloatArray, two: TwoPort, z0_ohm: float) -> Any:
    import skrf

    return skrf.Network(frequency=skrf.Frequency.from_f(f_hz, unit="hz"), s=two.matrix, z0=z0_ohm)


def _split(solved: Any, method: Literal["NZC", "ZC"], two_x_thru: TwoPort, resampled: bool) -> Split:
    left = TwoPort.of(solved.s_side1.s)
    right = TwoPort.of(solved.s_side2.s).flipped()
    rest = without(two_x_thru, left, right).s21
    level, phase = 20.0 * np.log10(np.abs(rest)), np.degrees(np.angle(rest))
    test = SelfTest(float(np.max(np.abs(level))), float(np.max(np.abs(phase))))
    return Split(left, right, method, quality(two_x_thru), fixture_class(two_x_thru), test, resampled)


def _refuse_numbers(two: TwoPort, what: str) -> None:
    if not all(np.isfinite(p).all() for p in two.planes):
        raise InvalidMeasurement(f"The {what} holds a value that is not a number.", f"Read the {what} again.")


def _refuse(f_hz: FloatArray, two: TwoPort) -> bool:
    """Refuse what cannot be split; tell whether the grid must be changed for it."""
    if len(f_hz) < 16:
        raise InvalidMeasurement(
            f"A 2x-thru of {len(f_hz)} points cannot be split in time; at least 16 are needed.",
            "Sweep it with more points.",
        )
    _refuse_numbers(two, "2x-thru")
    refuse_active(two, "The 2x-thru")
    weakest = float(np.min(np.abs(two.s21)))
    if not weakest > 1e-3:
        raise InvalidMeasurement(
            f"The 2x-thru lets through only {20 * np.log10(max(weakest, 1e-12)):.0f} dB somewhere in the "
            "sweep; halves cannot be found where nothing passes.",
            "See that the 2x-thru is contacted at both ends, or narrow the sweep.",
        )
    step = np.diff(f_hz)
    even = bool(np.max(np.abs(step - step[0])) < 1e-6 * step[0])
    turns = float(np.abs(np.unwrap(np.angle(two.s21))[-1] - np.unwrap(np.angle(two.s21))[0]) / (2 * np.pi))
    if turns < 1.0:
        raise InvalidMeasurement(
            f"Over the sweep the 2x-thru is only {turns:.2f} wavelengths longer at the end than at the "
            "start; below 1 its two ends cannot be told apart in time.",
            "Sweep to a higher frequency, or use the halves' own files.",
        )
    return not (even and abs(f_hz[0] - step[0]) < 1e-6 * step[0])
