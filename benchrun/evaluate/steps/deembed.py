"""A fixture out of a result, in the S-domain, for the nominal values and every variation alike."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.network import Network
from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.propagation.judged import stepped
from benchrun.evaluate.readings import Raw
from benchrun.evaluate.state import State, agree
from benchrun.evaluate.steps.removal import Around, Halves, Impedances, Planes, Removal, Thru, inverse
from benchrun.evaluate.steps.removing import removal_of
from benchrun.hookup import Hookup
from benchrun.rf.tone import Tone
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.steps import DeEmbed

__all__ = ["DeEmbedArithmetic"]

_ROWS = 8
"""Variations taken at once: their planes then stay in the processor's cache, which halves the time."""


class DeEmbedArithmetic:
    """Move the reference planes to the unit."""

    def hookups(self, step: DeEmbed, procedure: Procedure) -> tuple[Hookup, ...]:
        """Nothing to connect."""
        return ()

    def apply(self, step: DeEmbed, state: State, readings: Mapping[str, Raw]) -> None:
        """Leave a network."""
        source = state.networks[step.from_]
        if isinstance(source.nominal, Tone):  # refused when the sequence was checked
            raise InvalidMeasurement(
                "A tone has no S-parameters to take a fixture out of.", "Correct the sequence."
            )
        removal, trail = removal_of(step, state, source), state.trails.get(step.from_)
        if trail is not None:
            if (halves := _as_halves(removal)) is not None:
                state.trails[step.name] = replace(trail, fixtures=(*trail.fixtures, halves))
            else:
                # No trail leads through this; the variations known so far go on as they are.
                source = stepped(trail, state.procedure.sources, source, state.procedure.noise_seed)
        assert not isinstance(source.nominal, Tone)  # see above
        assert not isinstance(source.varied, Tone)
        nominal = removal.take(source.nominal)
        varied = None if source.varied is None else _each(source.varied, removal)
        if state.thorough:
            agree(state, step.name, nominal, removal.examined(source))
        z0_ohm, ports_ohm = source.z0_ohm, source.ports_ohm
        if isinstance(removal, Impedances):
            one, two = removal.new
            plain = one == two and one.imag == 0.0
            z0_ohm, ports_ohm = (one.real, None) if plain else (z0_ohm, removal.new)
        state.networks[step.name] = Network(
            source.f_hz, nominal, varied, source.systematic, z0_ohm, ports_ohm
        )
        state.kinds[step.name] = "de-embedded"


def _as_halves(removal: Removal) -> tuple[TwoPort | None, TwoPort | None] | None:
    """What is taken out as two halves, if it can be told so."""
    if isinstance(removal, Halves):
        return removal.left, removal.right
    if isinstance(removal, Thru):
        return removal.halves
    if isinstance(removal, Around):
        left, right = removal.left, removal.right
        return None if left is None else inverse(left), None if right is None else inverse(right)
    return None


def _each(data: Planes, removal: Removal) -> Planes:
    """As ``removal.take``, for many variations ``(v, f)``."""
    if not isinstance(data, TwoPort):
        return removal.take(data)
    planes = tuple(np.empty_like(plane) for plane in data.planes)
    for first in range(0, len(data.s11), _ROWS):
        rows = slice(first, first + _ROWS)
        part = removal.take(data.map(lambda plane: plane[rows]))  # noqa: B023 - used at once
        assert isinstance(part, TwoPort)  # a two-port without its fixture is one
        for whole, piece in zip(planes, part.planes, strict=True):
            whole[rows] = piece
    return TwoPort(*planes)
