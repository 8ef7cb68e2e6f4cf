"""Influences drawn once a run: the standards' own doubts, leakage past the unit, fixtures off their files."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from benchrun.evaluate.propagation.influence import Influence
from benchrun.evaluate.propagation.seen import STEP, UNIT, Changes, Seen, wrapped
from benchrun.evaluate.propagation.trail import Trail, freed
from benchrun.hookup import Connection
from benchrun.rf.terms import TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort
from benchrun.uncertainty.distribution import Distribution
from benchrun.uncertainty.sources import Sources

__all__ = ["fixtures", "leakage", "standards"]


def standards(trail: Trail) -> Iterator[Influence]:
    """The kit's doubts: one draw a parameter, the same on whichever port the standard is connected."""
    kit, basis = trail.basis.kit, trail.basis
    for name in basis.method.takes(basis.options):
        standard = kit.standards[name]
        for parameter, size in standard.uncertainty.items():
            if not size:
                continue
            changes: Changes = {}
            for hookup in basis.hookups:
                for connection in hookup.connections:
                    if connection.items == (name,):
                        changes |= _definition(trail, hookup.text, connection, parameter, size)
            if changes:
                yield Influence(f"kit: {name}", Distribution.NORMAL, changes)


def _definition(trail: Trail, text: str, connection: Connection, parameter: str, size: float) -> Changes:
    kit, f_hz = trail.basis.kit, trail.f_hz
    standard = kit.standards[connection.items[0]]
    see = Seen(trail, text, connection.ports, trail.basis.readings[text])
    true = see.true

    def moved(h: complex) -> TwoPort | ComplexArray:
        # Steps are of the parameter's own size: a standard is no unit number.
        delta = {parameter: size * h.real / STEP}
        if isinstance(true, TwoPort):
            new, old = (standard.two_port(f_hz, kit.z0_ohm, d) for d in (delta, None))
            return TwoPort(*(t + n - o for t, n, o in zip(true.planes, new.planes, old.planes, strict=True)))
        new_one, old_one = (standard.reflection(f_hz, kit.z0_ohm, d) for d in (delta, None))
        return true + new_one - old_one

    found = see.change(moved, (complex(STEP),))
    return {where: tuple(axis * STEP for axis in axes) for where, axes in found.items()}


def leakage(trail: Trail, sources: Sources) -> Iterator[Influence]:
    """Past the unit, the same in every reading of a run: it cancels where it was read as isolation."""
    if not sources.isolation_leakage or not isinstance(trail.terms, TwelveTerms):
        return
    shape = sources.shape("isolation")
    size = np.full(trail.f_hz.shape, shape.standard(sources.isolation_leakage, vector=True), np.complex128)
    texts = [h.text for h in trail.basis.hookups if len(h.ports) == 2]
    for plane in (1, 2):
        yield Influence(
            "isolation", shape, {(text, plane): (size, 1j * size) for text in (*texts, UNIT)}, vector=True
        )


def fixtures(trail: Trail, sources: Sources) -> Iterator[Influence]:
    """Halves that are not quite their files: longer, of another impedance, lossier, another launch."""
    kinds = {
        "delay": sources.fixture_delay, "impedance": sources.fixture_impedance, "loss": sources.fixture_loss,
        "launch": sources.fixture_launch,
    }  # fmt: skip
    if not trail.fixtures or not any(kinds.values()):
        return
    shape, see = sources.shape("fixture"), Seen(trail, UNIT, trail.hookup.ports, trail.unit)
    left, right = trail.fixtures[-1]
    unit = freed(see.true, trail.fixtures)
    for kind, declared in kinds.items():
        size = shape.standard(declared)
        if not size:
            continue
        for side, half in ((0, left), (1, right)):
            if half is None:
                continue
            # Seen with its unit's side as port 2.
            own = half if side == 0 else half.flipped()

            changes = _moved(trail, see, unit, own, side, kind, size)
            yield Influence("fixture", shape, changes)


def _moved(
    trail: Trail, see: Seen, unit: TwoPort | ComplexArray, own: TwoPort, side: int, kind: str, size: float
) -> Changes:
    left, right = trail.fixtures[-1]

    def moved(h: complex) -> TwoPort | ComplexArray:
        changed = _off(own, kind, size * h.real / STEP, trail.f_hz)
        halves = (changed, right) if side == 0 else (left, changed.flipped())
        return wrapped(unit, (halves,), trail.fixtures[:-1])

    found = see.change(moved, (complex(STEP),))
    return {where: tuple(axis * STEP for axis in axes) for where, axes in found.items()}


def _off(half: TwoPort, kind: str, amount: float, f_hz: FloatArray) -> TwoPort:
    """A half, port 2 at the unit, off by an amount."""
    if kind == "impedance":
        # A line between two steps that all but cancel: what the far one adds has been there and back.
        echo = amount / (2.0 * 50.0) * (1.0 - half.s21 * half.s12)
        return TwoPort(half.s11 + echo, half.s12, half.s21, half.s22 + echo)
    if kind == "launch":
        y = np.asarray(2j * np.pi * f_hz * amount * 50.0, np.complex128)
        echo, past = np.asarray(-y / (2.0 + y)), np.asarray(2.0 / (2.0 + y), np.complex128)
        return half @ TwoPort(echo, past, past, echo)
    exponent = 2j * np.pi * f_hz * amount if kind == "delay" else amount * np.sqrt(f_hz / 1e9) + 0j
    through = np.asarray(np.exp(-exponent), dtype=np.complex128)
    nothing = np.zeros_like(through)
    return half @ TwoPort(nothing, through, through, nothing)
