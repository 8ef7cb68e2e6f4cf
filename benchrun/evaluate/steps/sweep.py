"""A raw reading of the unit to corrected S-parameters, with the variations of their uncertainty."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.network import Data, Network
from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.propagation.trail import Trail
from benchrun.evaluate.readings import Raw, two_ports
from benchrun.evaluate.state import Calibration, State, agree
from benchrun.hookup import Hookup
from benchrun.rf.calibration.one_path import turned_round
from benchrun.rf.calibration.one_port import own_reflection
from benchrun.rf.calibration.switch_terms import SWITCH_READING
from benchrun.rf.terms import OnePortTerms, TwelveTerms
from benchrun.rf.tone import Tone
from benchrun.rf.twoport import ComplexArray, TwoPort
from benchrun.sequence.steps import Calibrate, Sweep

__all__ = ["SweepArithmetic", "correct"]


def correct(terms: object, raw: TwoPort, ports: tuple[int, ...]) -> Data:
    """Take the error terms out of a raw reading."""
    if isinstance(terms, TwelveTerms):
        return terms.correct(raw)
    assert isinstance(terms, OnePortTerms)  # the two kinds of terms that methods solve for
    return terms.correct(own_reflection(raw, ports[0]))


def _refuse_standard(calibration: Calibration, raw: TwoPort) -> None:
    """Nothing is concluded about a unit whose reading is that of a standard: it was not connected yet.

    Two connections of like parts differ by their joints; a reading that differs from a standard's by no more
    than noise is of the very same connection.

    Raises
    ------
    InvalidMeasurement
        Naming what is still connected.
    """
    for text, standard in calibration.standards.items():
        if text == SWITCH_READING:
            continue
        if len(calibration.ports) == 2:
            pairs = list(zip(raw.planes, standard.planes, strict=True))
        else:
            port = calibration.ports[0]
            pairs = [(own_reflection(raw, port), own_reflection(standard, port))]
        if all(_rms(a - b) < _SAME * _rms(b) + _NOISE for a, b in pairs):
            raise InvalidMeasurement(
                f"The unit reads like {text!r}, as if that were still connected.",
                "Connect the unit, tighten it, and run again.",
            )


def _rms(plane: ComplexArray) -> float:
    return float(np.sqrt(np.mean(np.abs(plane) ** 2)))


_SAME, _NOISE = 4e-4, 1e-5
"""Readings of one connection differ by less: trace noise in proportion, and the noise floor."""


class SweepArithmetic:
    """Correct where a calibration is named; else hand on the raw reading, without uncertainty."""

    def hookups(self, step: Sweep, procedure: Procedure) -> tuple[Hookup, ...]:
        """The unit in its fixture; once more turned round where the calibration is for one path."""
        named = (s for s in procedure.sequence.steps if isinstance(s, Calibrate) and s.name == step.with_)
        calibration = next(named, None)
        forward = procedure.unit_hookup(calibration.used_ports[0] if calibration else 1)
        if calibration is None or not calibration.turns:
            return (forward,)
        return forward, procedure.unit_hookup(1, turned=True)

    def apply(self, step: Sweep, state: State, readings: Mapping[str, Raw]) -> None:
        """Leave a network."""
        procedure = state.procedure
        needed, swept = self.hookups(step, procedure), two_ports(readings)
        raw = swept[needed[0].text]
        if len(needed) == 2:
            raw = turned_round(raw, swept[needed[1].text])
        if step.with_ is None:
            grid = procedure.sequence.sweep_of(step).grid()
            nominal: Data = raw if procedure.sequence.unit.ports == 2 else raw.s11
            state.networks[step.name], state.kinds[step.name] = Network(grid, nominal), "uncorrected"
            return
        calibration = state.calibrations[step.with_]
        residual = procedure.residual_of(procedure.sequence.sweep_of(step))
        _refuse_standard(calibration, raw)
        nominal = correct(calibration.terms, raw, calibration.ports)
        agree(state, step.name, nominal, calibration.examiner(raw))
        varied, systematic = None, 0
        if calibration.noise is not None:
            assert not isinstance(nominal, Tone)  # corrected from 2x2 readings
            assert not isinstance(calibration.noise, Tone)
            varied = residual.vary(nominal, calibration.noise)
            systematic = residual.steps if isinstance(nominal, TwoPort) else residual.one_port_steps
        state.networks[step.name] = Network(calibration.f_hz, nominal, varied, systematic, calibration.z0_ohm)
        state.kinds[step.name] = "corrected"
        if (basis := calibration.basis) is not None:
            state.trails[step.name] = Trail(
                calibration.f_hz, basis, calibration.terms, raw, needed[0], basis.noise,
                definitions=basis.definitions(calibration.f_hz),
            )  # fmt: skip
