"""Connectors of instruments: what they reflect, and what comes out of them."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Protocol

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.instruments.signals import KT0_MW_HZ, Gamma, Signal
from sim_instruments.waves import Plane, Real

__all__ = ["Outlet", "Source", "match_of", "together"]


class Source(Protocol):
    """What sends a signal out of an outlet."""

    def signal(self) -> Signal:
        """What would run into a matched load."""
        ...


def _matched(f_hz: Real) -> Plane:
    return np.zeros(len(f_hz), np.complex128)


def match_of(draws: Draws, return_loss_db: float) -> Gamma:
    """A connector of a return loss, its phase turning with frequency: one reflection some way inside."""
    size, turn = 10 ** (-abs(return_loss_db) / 20), draws.phase("match")
    delay_s = draws.uniform("match delay", 0.1e-9, 0.6e-9)
    return lambda f_hz: np.asarray(size * turn * np.exp(-2j * np.pi * f_hz * delay_s))


@dataclass
class Outlet:
    """A connector of an instrument.

    Parameters
    ----------
    gamma
        Its reflection; matched if not given.
    sources
        What feeds it; more than one: through a combiner inside.
    owners
        The instruments that it belongs to, in words; none: the network analyzers.
    """

    gamma: Gamma = _matched
    sources: list[Source] = field(default_factory=list)
    owners: list[str] = field(default_factory=list)

    def signal(self) -> Signal:
        """What comes out of it into a matched load; tones of one frequency stay apart."""
        return together([source.signal() for source in self.sources])


def together(signals: list[Signal]) -> Signal:
    """Signals on one line; the noise of the line itself counts once."""
    if not signals:
        return Signal.none()
    return Signal(
        np.concatenate([s.f_hz for s in signals]),
        np.concatenate([s.wave for s in signals]),
        lambda f_hz: KT0_MW_HZ + np.asarray(sum(s.noise(f_hz) - KT0_MW_HZ for s in signals)),
    )
