"""Fixture halves out of a result, in the S-domain, for the nominal values and every variation alike."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.network import Data, Network
from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.readings import Raw
from benchrun.evaluate.state import State, agree
from benchrun.hookup import Hookup
from benchrun.rf.interpolation import resample
from benchrun.rf.tone import Tone
from benchrun.rf.touchstone import TouchstoneData
from benchrun.rf.twoport import FloatArray, TwoPort
from benchrun.sequence.steps import DeEmbed

__all__ = ["DeEmbedArithmetic"]


class DeEmbedArithmetic:
    """Move the reference planes to the unit."""

    def hookups(self, step: DeEmbed, procedure: Procedure) -> tuple[Hookup, ...]:
        """Nothing to connect."""
        return ()

    def apply(self, step: DeEmbed, state: State, readings: Mapping[str, Raw]) -> None:
        """Leave a network."""
        source = state.networks[step.from_]

        def half(name: str | None) -> TwoPort | None:
            if name is None:
                return None
            key = f"{step.name} {name}"
            if key not in state.halves:
                state.halves[key] = _on_grid(state.procedure.fixtures[name], source.f_hz)
            return state.halves[key]

        left, right = half(step.left), half(step.right)
        nominal = _without(source.nominal, left, right)
        varied = None if source.varied is None else _without_each(source.varied, left, right)
        if state.thorough:
            agree(state, step.name, nominal, _by_scikit_rf(source, left, right))
        state.networks[step.name] = Network(source.f_hz, nominal, varied, source.systematic, source.z0_ohm)
        state.kinds[step.name] = "de-embedded"


def _on_grid(fixture: TouchstoneData, f_hz: FloatArray) -> TwoPort:
    two = fixture.two_port
    if np.array_equal(fixture.f_hz, f_hz):
        return two
    if (
        f_hz[0] < fixture.f_hz[0] or f_hz[-1] > fixture.f_hz[-1]
    ):  # checked before the run, with the file's name
        raise InvalidMeasurement("A fixture file does not reach over the sweep.", "Use a file that does.")
    return two.map(lambda plane: resample(fixture.f_hz, plane, f_hz))


_ROWS = 8
"""Variations taken at once: their planes then stay in the processor's cache, which halves the time."""


def _without_each(data: Data, left: TwoPort | None, right: TwoPort | None) -> Data:
    """As :func:`_without`, for many variations ``(v, f)``."""
    if not isinstance(data, TwoPort):
        return _without(data, left, right)
    planes = tuple(np.empty_like(plane) for plane in data.planes)
    for first in range(0, len(data.s11), _ROWS):
        rows = slice(first, first + _ROWS)
        part = _without(data.map(lambda plane: plane[rows]), left, right)  # noqa: B023 - used at once
        assert isinstance(part, TwoPort)  # a two-port without its fixture is one
        for whole, piece in zip(planes, part.planes, strict=True):
            whole[rows] = piece
    return TwoPort(*planes)


def _without(data: Data, left: TwoPort | None, right: TwoPort | None) -> Data:
    if isinstance(data, Tone):  # refused when the sequence was checked
        raise InvalidMeasurement(
            "A tone has no S-parameters to take a fixture out of.", "Correct the sequence."
        )
    if not isinstance(data, TwoPort):
        return data if left is None else _reflection_behind(data, left)
    rest = data if left is None else data.without_left(left)
    return rest if right is None else rest.without_right(right)


def _reflection_behind(seen: np.ndarray[tuple[int, ...], np.dtype[np.complex128]], half: TwoPort) -> Data:
    """Reflection of a one-port behind a fixture half."""
    u = (seen - half.s11) / (half.s12 * half.s21)
    return np.asarray(u / (1.0 + half.s22 * u))


def _by_scikit_rf(source: Network, left: TwoPort | None, right: TwoPort | None) -> Data:
    import skrf

    frequency = skrf.Frequency.from_f(source.f_hz, unit="hz")

    def network(two: TwoPort) -> skrf.Network:
        return skrf.Network(frequency=frequency, s=two.matrix, z0=source.z0_ohm)

    result = skrf.Network(frequency=frequency, s=source.matrix, z0=source.z0_ohm)
    if left is not None:
        result = network(left).inv ** result
    if right is not None and source.ports == 2:
        result = result ** network(right).inv
    return TwoPort.of(result.s) if source.ports == 2 else np.asarray(result.s[:, 0, 0], dtype=np.complex128)
