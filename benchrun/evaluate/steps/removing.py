"""From the words of a step ``de-embed`` to what is taken out."""

from __future__ import annotations

from typing import cast

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.network import Network
from benchrun.evaluate.state import State
from benchrun.evaluate.steps.removal import Around, Dummies, Halves, Impedances, Removal, Thru
from benchrun.rf.deembedding.adapter import adapter_between
from benchrun.rf.deembedding.dummies import halves_of_thru
from benchrun.rf.deembedding.orientation import refuse_turned
from benchrun.rf.deembedding.quality import Quality, fixture_class, quality
from benchrun.rf.deembedding.two_x_thru import Split, split_nzc, split_zc
from benchrun.rf.interpolation import resample
from benchrun.rf.terms import OnePortTerms, TwelveTerms
from benchrun.rf.touchstone import TouchstoneData
from benchrun.rf.twoport import FloatArray, TwoPort
from benchrun.sequence.steps import DeEmbed
from benchrun.sequence.steps.deembed import Adapter, TwoThru

__all__ = ["on_grid", "quality_text", "removal_of"]

_GRADES = ("good", "acceptable", "inconclusive", "poor")
_CLASSES = ("A", "B", "C", "none")


def removal_of(step: DeEmbed, state: State, source: Network) -> Removal:
    """Make what a step takes out, on the grid of what it is taken out of.

    Raises
    ------
    InvalidMeasurement
        If a half is the wrong way round, a 2x-thru is too poor, or an adapter cannot be found.
    """
    if step.renormalise is not None:
        old = source.impedance(1), source.impedance(2)
        return Impedances(old, step.renormalise, step.waves or "power")
    if step.shift is not None:
        lines = {port: _line(shift.extension.transmission(source.f_hz)) for port, shift in step.shift.items()}
        if source.ports == 1:
            return Halves(next(iter(lines.values())), None)
        return Halves(lines.get(1), lines.get(2))
    if step.adapter is not None:
        adapter = _adapter(step, step.adapter, state, source)
        # Calibrated with it and read without it: the result lacks it once, so it is put there.
        first = step.adapter.port == 1 or source.ports == 1
        return Around(adapter, None) if first else Around(None, adapter.flipped())
    if step.dummies is not None:
        opened, short, thru = (
            None if name is None else _of(step, state, source, name)
            for name in (step.dummies.open, step.dummies.short, step.dummies.thru)
        )
        if thru is not None:
            circuit = step.dummies.circuit
            return Thru(thru, halves_of_thru(thru, circuit), circuit)
        return Dummies(opened, short, step.dummies.first)
    if step.two_thru is not None:
        return _split(step, step.two_thru, state, source)
    return _halves(step, state, source)


def _of(step: DeEmbed, state: State, source: Network, name: str) -> TwoPort:
    """A file on the grid; kept for the next unit."""
    key = f"{step.name} {name}"
    if key not in state.halves:
        state.halves[key] = on_grid(state.procedure.fixtures[name], source.f_hz)
    return state.halves[key]


def on_grid(fixture: TouchstoneData, f_hz: FloatArray) -> TwoPort:
    """A fixture file on a sweep's grid.

    Raises
    ------
    InvalidMeasurement
        If it does not reach over the sweep.
    """
    two = fixture.two_port
    if np.array_equal(fixture.f_hz, f_hz):
        return two
    if (
        f_hz[0] < fixture.f_hz[0] or f_hz[-1] > fixture.f_hz[-1]
    ):  # checked before the run, with the file's name
        raise InvalidMeasurement("A fixture file does not reach over the sweep.", "Use a file that does.")
    return two.map(lambda plane: resample(fixture.f_hz, plane, f_hz))


def _line(transmission: np.ndarray[tuple[int, ...], np.dtype[np.complex128]]) -> TwoPort:
    zero = np.zeros_like(transmission)
    return TwoPort(zero, transmission, transmission, zero)


def _halves(step: DeEmbed, state: State, source: Network) -> Removal:
    left = None if step.left is None else _of(step, state, source, step.left)
    right = None if step.right is None else _of(step, state, source, step.right)
    if step.embed:
        return Around(left, right)
    if isinstance(source.nominal, TwoPort):
        for half, side, name in ((left, "left", step.left), (right, "right", step.right)):
            if half is not None:
                refuse_turned(source.f_hz, source.nominal, half, side, str(name))
    return Halves(left, right)


def _split(step: DeEmbed, how: TwoThru, state: State, source: Network) -> Removal:
    data, left, right = state.procedure.fixtures[how.file], f"{step.name} left", f"{step.name} right"
    if left in state.halves and not how.follow_impedance:
        return Halves(state.halves[left], state.halves[right])
    two = data.two_port
    _refuse_poor(how, quality(two), two)
    if how.follow_impedance:
        whole = cast(TwoPort, source.nominal)  # a unit of one port is refused when the sequence is checked
        split = split_zc(source.f_hz, _of(step, state, source, how.file), whole, source.z0_ohm)
        _refuse_residual(how, split)
        return Halves(split.left, split.right)
    split = split_nzc(data.f_hz, two, data.z0_ohm)
    _refuse_residual(how, split)
    for key, half in ((left, split.left), (right, split.right)):
        same = np.array_equal(data.f_hz, source.f_hz)
        state.halves[key] = half if same else half.map(lambda p: resample(data.f_hz, p, source.f_hz))
    return Halves(state.halves[left], state.halves[right])


def _refuse_poor(how: TwoThru, found: Quality, two: TwoPort) -> None:
    letter = fixture_class(two).letter
    if how.fixture_class is not None and _CLASSES.index(letter) > _CLASSES.index(how.fixture_class):
        raise InvalidMeasurement(
            f"{how.file} is of class {letter} after IEEE 370; the sequence asks for {how.fixture_class}. "
            f"{quality_text(two)}",
            "Make a better fixture, narrow the sweep, or ask for less in the sequence.",
        )
    if how.quality is not None and _GRADES.index(found.worst) > _GRADES.index(how.quality):
        raise InvalidMeasurement(
            f"{how.file} is {found.worst} after IEEE 370; the sequence asks for {how.quality}. "
            f"{quality_text(two)}",
            "Measure the 2x-thru again after a fresh calibration, or ask for less in the sequence.",
        )


def _refuse_residual(how: TwoThru, split: Split) -> None:
    test = split.self_test
    if not test.good:
        raise InvalidMeasurement(
            f"{how.file} without its own halves still shows {test.magnitude_db:.2f} dB and "
            f"{test.phase_deg:.1f} degrees; 0.1 dB and 1 degree are allowed.",
            "Sweep the 2x-thru in even steps from the first step on, wider or with more points.",
        )


def quality_text(two: TwoPort) -> str:
    """Quality metrics and electrical class of a 2x-thru after IEEE 370, in a sentence."""
    found, fixture = quality(two), fixture_class(two)
    return (
        f"2x-thru after IEEE 370: causality {found.causality:.1f} %, passivity {found.passivity:.1f} %, "
        f"reciprocity {found.reciprocity:.1f} % ({found.worst}); class {fixture.letter}, loss "
        f"{-fixture.insertion_db:.2f} dB, return loss {-fixture.reflection_db:.1f} dB"
    )


def _adapter(step: DeEmbed, how: Adapter, state: State, source: Network) -> TwoPort:
    if how.file is not None:
        return _of(step, state, source, how.file)
    outer, inner = state.calibrations[str(how.without)], state.calibrations[str(how.behind)]
    for calibration, name in ((outer, how.without), (inner, how.behind)):
        if not np.array_equal(calibration.f_hz, source.f_hz):
            raise InvalidMeasurement(
                f"The calibration {name} was made over another sweep than the result {step.from_}.",
                "Calibrate both over the same sweep.",
            )
    return adapter_between(
        source.f_hz, _port_of(outer.terms, how.port), _port_of(inner.terms, how.port), how.delay or 0.0
    )


def _port_of(terms: TwelveTerms | OnePortTerms, port: int) -> OnePortTerms:
    if isinstance(terms, OnePortTerms):
        return terms
    return terms.forward.port if port == 1 else terms.reverse.port
