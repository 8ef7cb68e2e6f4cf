"""What each source changes in each raw reading, to first order around the readings themselves.

Every source is carried back to the readings it acts on, also the definition of a standard and a fixture that
is not quite its file: a reading is what the true standard gave, so a standard off by some amount is a reading
off by what that does to it. Then the calibration is solved with readings that move and definitions that stay,
whatever the method; a method that does not use a property of a standard does not heed its doubt.

The step from source to reading is linear (sizes are some thousandths, their squares some millionths); that
from readings to figures is not, and is carried out in full for every draw.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from benchrun.evaluate.propagation.influence import Influence
from benchrun.evaluate.propagation.lasting import fixtures, leakage, standards
from benchrun.evaluate.propagation.seen import STEP, UNIT, Changes, Seen, joint
from benchrun.evaluate.propagation.trail import Trail
from benchrun.hookup import Connection
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort
from benchrun.uncertainty.sources import Sources

__all__ = ["influences"]


def influences(trail: Trail, sources: Sources) -> Iterator[Influence]:
    """All influences but noise.

    Parameters
    ----------
    trail
        What was done.
    sources
        Declared by the bench; the kit's doubts come with the trail.
    """
    for hookup in trail.basis.hookups:
        reading = trail.basis.readings[hookup.text]
        for connection in hookup.connections:
            yield from _connection(trail, sources, hookup.text, connection, reading, inner=False)
    for connection in trail.hookup.connections:
        yield from _connection(trail, sources, UNIT, connection, trail.unit, inner=True)
    yield from standards(trail)
    yield from leakage(trail, sources)
    yield from fixtures(trail, sources)


# -- one connection ------------------------------------------------------------------------------------------


def _connection(
    trail: Trail, sources: Sources, text: str, connection: Connection, reading: TwoPort, inner: bool
) -> Iterator[Influence]:
    ghz = trail.f_hz / 1e9
    ends = connection.ports
    for group, size, growth in (
        ("connector", sources.connector_repeatability, ghz),
        ("connector", sources.connector_floor, np.ones_like(ghz)),
        ("cable", sources.cable_reflection, np.ones_like(ghz)),
    ):
        if size:
            shape = sources.shape(group)
            step = shape.standard(size, vector=True) * growth
            within = inner and group == "connector"
            for axes in _joints(trail, text, ends, reading, step, within):
                yield Influence(_NAMES[group], shape, axes, vector=True)
    yield from _passing(trail, sources, text, ends, reading)
    yield from _drifting(trail, sources, text, ends, reading)


_NAMES = {"connector": "connector repeatability", "cable": "cable flexure"}


def _joints(
    trail: Trail, text: str, ends: tuple[int, ...], reading: TwoPort, step: FloatArray, inner: bool
) -> Iterator[Changes]:
    """Changes by one joint at each place of a connection, two axes each."""
    see = Seen(trail, text, ends, reading)
    for place in see.places(inner):
        yield see.change(lambda h, place=place: place(joint(h * step)), (STEP, 1j * STEP))  # type: ignore[misc]


def _planes(ends: tuple[int, ...], reading: TwoPort) -> dict[int, ComplexArray]:
    """The planes of a reading that a connection shows."""
    if len(ends) == 2:
        return dict(enumerate(reading.planes))
    return {0: reading.s11} if ends[0] == 1 else {3: reading.s22}


def _crossings(plane: int, port: int) -> int:
    """How often a signal passes the cable of a port."""
    return {1: (2, 1, 1, 0), 2: (0, 1, 1, 2)}[port][plane]


def _passing(
    trail: Trail, sources: Sources, text: str, ends: tuple[int, ...], reading: TwoPort
) -> Iterator[Influence]:
    shape, ghz, shown = sources.shape("cable"), trail.f_hz / 1e9, _planes(ends, reading)
    for port in ends:
        passes = {(text, p): n * m for p, m in shown.items() if (n := _crossings(p, port))}
        if sources.cable_magnitude:
            size = shape.standard(sources.cable_magnitude)
            yield Influence("cable flexure", shape, {w: (size * m,) for w, m in passes.items()})
        if sources.cable_phase:
            angle = 1j * shape.standard(sources.cable_phase) * ghz
            yield Influence("cable flexure", shape, {w: (angle * m,) for w, m in passes.items()})


def _drifting(
    trail: Trail, sources: Sources, text: str, ends: tuple[int, ...], reading: TwoPort
) -> Iterator[Influence]:
    shown = _planes(ends, reading)
    if sources.drift:
        shape = sources.shape("drift")
        size = shape.standard(sources.drift, vector=True)
        for port in ends:  # rows of a reading are what the receivers of one port see
            rows = {p: m for p, m in shown.items() if (1 if p < 2 else 2) == port}
            yield Influence(
                "drift", shape, {(text, p): (size * m, 1j * size * m) for p, m in rows.items()}, True
            )
    if sources.drift_delay_per_kelvin and sources.drift_room:
        shape = sources.shape("drift")
        delay = shape.standard(sources.drift_delay_per_kelvin * sources.drift_room)
        turn = -2j * np.pi * trail.f_hz * 2.0 * delay
        yield Influence("drift", shape, {(text, p): (turn * m,) for p, m in shown.items()})
    if sources.linearity_deviation:
        shape = sources.shape("linearity")
        size = shape.standard(sources.linearity_deviation)
        for p, m in shown.items():
            yield Influence("linearity", shape, {(text, p): (size * m,)})
