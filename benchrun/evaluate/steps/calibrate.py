"""Readings of standards to error terms."""

from __future__ import annotations

import functools
from collections.abc import Iterable, Mapping

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.network import Data
from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.propagation.trail import Basis
from benchrun.evaluate.readings import Raw, two_ports
from benchrun.evaluate.state import Calibration, State, agree
from benchrun.hookup import Hookup
from benchrun.rf.calibration import define
from benchrun.rf.calibration.method import Readings
from benchrun.rf.calibration.one_path import turned_round
from benchrun.rf.calibration.suspicion import SURE, Suspicion, suspect
from benchrun.rf.calibration.switch_terms import SWITCH_READING
from benchrun.rf.twoport import ComplexArray, TwoPort
from benchrun.sequence.steps import Calibrate

__all__ = ["ADVICE", "NOISE_DRAWS", "CalibrateArithmetic", "refuse_suspects", "sure_doubts"]

NOISE_DRAWS = 20
"""Draws of noise, each of four complex readings.

Their share of an uncertainty, small beside the systematic one after any sensible choice of bandwidth, is then
known to one part in six (1 / sqrt(2 n)).
"""


ADVICE = (
    "See that the right standard hangs on the right port, clean and tight, and its cable whole; then "
    "calibrate again."
)
"""What to do about a connection that stays suspicious."""


class CalibrateArithmetic:
    """Solve a calibration and have scikit-rf solve it too."""

    def hookups(self, step: Calibrate, procedure: Procedure) -> tuple[Hookup, ...]:
        """The standards of the method."""
        return step.how.required(step.used_ports, step.isolation, step.options)

    def apply(self, step: Calibrate, state: State, readings: Mapping[str, Raw]) -> None:
        """Leave a :class:`Calibration`."""
        procedure, method, ports = state.procedure, step.how, step.used_ports
        swept = two_ports(readings)
        f_hz, kit = procedure.sequence.sweeps[step.sweep].grid(), procedure.kits[step.kit]
        options = step.options
        definitions = define(kit, method.takes(options), f_hz)
        refuse_suspects(suspect(definitions, swept, f_hz))
        terms = method.solve(ports, definitions, swept, step.isolation, options)
        examiner = method.examiner(f_hz, ports, kit, swept, step.isolation, options)
        raw = swept[self.hookups(step, procedure)[-1].text]  # the last one joins the ports, or is the load
        if step.turns:
            raw = turned_round(raw, raw)
        agree(state, step.name, _correct(terms, raw, ports), examiner(raw))
        _keep_heap()
        # Declared residual terms are those of a full correction: they say nothing of a normalization, nor
        # of a method whose idle ports nobody read.
        full = method.name != "response" and (not method.without_switch_terms or SWITCH_READING in swept)
        declared = procedure.residual.declared and full and not procedure.sources.declared
        noise = _noise(len(ports), len(f_hz), procedure.noise_seed) if declared else None
        basis = None
        if procedure.sources.declared and not step.turns:
            setup, hookups = procedure.sequence.sweeps[step.sweep], self.hookups(step, procedure)
            made = procedure.sources.noise(setup.bandwidth, setup.power, setup.averages)
            basis = Basis(method, ports, kit, hookups, swept, made, step.isolation, options)
        state.calibrations[step.name] = Calibration(
            f_hz, ports, terms, examiner, noise, kit.z0_ohm, basis, swept
        )


def sure_doubts(step: Calibrate, procedure: Procedure, readings: Readings) -> list[Suspicion]:
    """Connections that look wrong in the readings so far, the surest first; hints are left out."""
    f_hz = procedure.sequence.sweeps[step.sweep].grid()
    definitions = define(procedure.kits[step.kit], step.how.takes(step.options), f_hz)
    return [doubt for doubt in suspect(definitions, readings, f_hz) if doubt.confidence > SURE]


def refuse_suspects(doubts: Iterable[Suspicion]) -> None:
    """No calibration is made of readings that look wrong.

    Raises
    ------
    InvalidMeasurement
        For the surest of them, naming its connection.
    """
    for doubt in doubts:
        if doubt.confidence > SURE:
            raise InvalidMeasurement(f"{doubt.hookup}: {doubt.reason}", ADVICE)


@functools.cache
def _keep_heap() -> None:
    """Let the allocator keep what it frees: once 30 MB were freed, glibc returns no more megabytes at a time.

    The arithmetic of uncertainty makes and drops arrays of that size all the time; giving each back to the
    system costs more than the arithmetic. Harmless where the C library is another.
    """
    np.empty(30 << 20, np.uint8)


def _correct(terms: object, raw: TwoPort, ports: tuple[int, ...]) -> Data:
    from benchrun.evaluate.steps.sweep import correct

    return correct(terms, raw, ports)


def _noise(ports: int, points: int, seed: int) -> Data:
    generator = np.random.default_rng(seed)

    def plane() -> ComplexArray:
        pair = generator.standard_normal((2, NOISE_DRAWS, points))
        return np.asarray((pair[0] + 1j * pair[1]) / np.sqrt(2.0))

    return TwoPort(plane(), plane(), plane(), plane()) if ports == 2 else plane()
