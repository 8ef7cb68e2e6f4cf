"""Everything that decides the numbers, beside the readings themselves."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from benchrun.hookup import Connection, Hookup
from benchrun.rf.kit import Kit
from benchrun.rf.masks import Mask
from benchrun.rf.touchstone import TouchstoneData
from benchrun.sequence.bench import NoiseAt
from benchrun.sequence.models import Sequence, SweepSetup
from benchrun.uncertainty.level import LevelTerms
from benchrun.uncertainty.montecarlo import ADAPTIVE, Effort
from benchrun.uncertainty.residual import ResidualTerms
from benchrun.uncertainty.sources import UNDECLARED, Sources

__all__ = ["NOISE_SEED", "Procedure"]

NOISE_SEED = 2718
"""Seed of the noise draws in an uncertainty. Fixed: the same readings must give the same numbers."""


@dataclass(frozen=True, slots=True, eq=False)
class Procedure:
    """A sequence with the files it names.

    Parameters
    ----------
    sequence
        The test.
    kits, masks, fixtures
        By the name that the sequence uses.
    residual
        Declared residual terms of the bench.
    noise_at
        Conditions of the declared noise; None: it is taken to hold as it stands.
    level
        Declared uncertainty of levels.
    scalar_ports
        Ports of the generator and of the spectrum analyzer.
    noise_seed
        Seed of the noise draws; stands in the record.
    sources
        Declared sources of uncertainty; where there are any, they are propagated in place of residual terms.
    effort
        How many trials that takes.
    """

    sequence: Sequence
    kits: Mapping[str, Kit] = field(default_factory=dict)
    masks: Mapping[str, Mask] = field(default_factory=dict)
    fixtures: Mapping[str, TouchstoneData] = field(default_factory=dict)
    residual: ResidualTerms = ResidualTerms()
    noise_seed: int = NOISE_SEED
    level: LevelTerms = LevelTerms()
    scalar_ports: tuple[int, int] = (3, 4)
    noise_at: NoiseAt | None = None
    sources: Sources = UNDECLARED
    effort: Effort = ADAPTIVE

    def residual_of(self, setup: SweepSetup) -> ResidualTerms:
        """The residual terms under a sweep's bandwidth, level and averaging."""
        if self.noise_at is None:
            return self.residual
        return self.residual.scaled(*self.noise_at.factors(setup.bandwidth, setup.power, setup.averages))

    def unit_hookup(self, port: int, turned: bool = False) -> Hookup:
        """How the unit is connected: in its fixture, between the ports or on ``port`` alone.

        Turned round, everything between the ports is: the whole chain is read from its other side.
        """
        unit = self.sequence.unit
        left, right = (unit.fixture.left, unit.fixture.right) if unit.fixture else (None, None)
        chain = tuple(item for item in (left, "unit", right if unit.ports == 2 else None) if item)
        if turned:
            chain = tuple(f"{item} turned round" for item in reversed(chain))
        return Hookup((Connection(chain, (1, 2) if unit.ports == 2 else (port,)),))
