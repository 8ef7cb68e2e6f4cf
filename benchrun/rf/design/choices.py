"""All ways to match one impedance with parts that can be bought, and how good each of them is."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from benchrun.rf.design.ladder import Ladder
from benchrun.rf.design.matched import input_vswr, matched_band, matched_yield, node_q
from benchrun.rf.design.matching import l_sections, pi_sections, stubs, tee_sections
from benchrun.rf.figures.band import at
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["Choice", "Wish", "choices"]


@dataclass(frozen=True, slots=True)
class Wish:
    """What is to be matched, and with what.

    Parameters
    ----------
    at_hz
        Where it is matched.
    z0_ohm
        Of the source.
    vswr
        Up to which it counts as matched.
    coils, capacitors
        E series of the parts.
    coil_q, capacitor_q
        Their quality at ``at_hz``.
    q
        Of pi and tee sections; None takes half as much again as they need at least, and not below 2.
    draws
        Pieces drawn for the yield.
    """

    at_hz: float
    z0_ohm: float = 50.0
    vswr: float = 1.5
    coils: str = "E24"
    capacitors: str = "E24"
    coil_q: float = 60.0
    capacitor_q: float = 400.0
    q: float | None = None
    draws: int = 1000


@dataclass(frozen=True, slots=True)
class Choice:
    """One network of real parts.

    Parameters
    ----------
    kind
        ``"L"``, ``"pi"``, ``"tee"`` or ``"stub"``.
    ladder
        With parts that can be bought, from the source to the load.
    vswr
        That the source sees at the frequency, with nominal parts.
    low_hz, high_hz
        Band in which the VSWR holds; nan where it reaches beyond the load's data, or does not hold at all.
    q
        Greatest ``|X| / R`` at its joints.
    good
        Share of pieces, parts drawn within their tolerances, whose VSWR holds at the frequency.
    loss_db
        What the network itself takes at the frequency, of the power that goes into it.
    """

    kind: str
    ladder: Ladder
    vswr: float
    low_hz: float
    high_hz: float
    q: float
    good: float
    loss_db: float


def choices(f_hz: FloatArray, load_ohm: ComplexArray, wish: Wish) -> tuple[Choice, ...]:
    """Work out every choice, the best first: by yield, then by bandwidth.

    Parameters
    ----------
    f_hz
        Frequencies at which the load is known, ``(f,)``, around ``wish.at_hz``.
    load_ohm
        The load there, ``(f,)``.
    wish
        The rest.

    Raises
    ------
    ValueError
        If the load takes no power, the frequency lies outside, or a wish makes no sense.

    Examples
    --------
    >>> f = np.linspace(150e6, 190e6, 41)
    >>> best = choices(f, np.full(41, 25.0 + 0j), Wish(169.4e6))[0]
    >>> best.kind, best.vswr < 1.5
    ('L', True)
    """
    if not f_hz[0] <= wish.at_hz <= f_hz[-1]:
        raise ValueError(
            f"{wish.at_hz / 1e6:g} MHz lies outside what is known of the load, {f_hz[0] / 1e6:g} MHz to "
            f"{f_hz[-1] / 1e6:g} MHz"
        )
    if not wish.vswr > 1.0:
        raise ValueError(f"a VSWR of {wish.vswr:g} bounds no band; it must be above 1")
    here = complex(at(f_hz, load_ohm.real, wish.at_hz)[0], at(f_hz, load_ohm.imag, wish.at_hz)[0])
    found = [_judged(kind, ladder, f_hz, load_ohm, here, wish) for kind, ladder in _ideal(here, wish)]

    def rank(one: Choice) -> tuple[float, float]:
        width = one.high_hz - one.low_hz
        return -round(one.good, 2), -(width if math.isfinite(width) else math.inf if one.good else 0.0)

    return tuple(sorted(found, key=rank))


def _ideal(here: complex, wish: Wish) -> Iterator[tuple[str, Ladder]]:
    at_hz, z0 = wish.at_hz, wish.z0_ohm
    for one in l_sections(here, at_hz, z0):
        yield "L", one
    parallel = 1.0 / (1.0 / here).real
    for kind, make, resistance in (("pi", pi_sections, parallel), ("tee", tee_sections, here.real)):
        least = math.sqrt(max(max(z0, resistance) / min(z0, resistance) - 1.0, 0.0))
        for one in make(here, at_hz, max(2.0, 1.5 * least) if wish.q is None else wish.q, z0):
            yield kind, one
    for one in stubs(here, at_hz, z0):
        yield "stub", one


def _judged(
    kind: str, ideal: Ladder, f_hz: FloatArray, load_ohm: ComplexArray, here: complex, wish: Wish
) -> Choice:
    ladder = ideal.real(
        wish.coils, wish.capacitors, (wish.coil_q, wish.at_hz), (wish.capacitor_q, wish.at_hz)
    )
    point, load = np.array([wish.at_hz]), np.array([here])
    low, high = matched_band(ladder, f_hz, load_ohm, wish.at_hz, wish.vswr)
    gamma = np.asarray((load - ladder.load_ohm) / (load + ladder.load_ohm), np.complex128)
    two = ladder.response(point)
    into = 1.0 - np.abs(two.terminated(gamma)) ** 2
    arrives = np.abs(two.s21 / (1.0 - two.s22 * gamma)) ** 2 * (1.0 - np.abs(gamma) ** 2)
    return Choice(
        kind,
        ladder,
        float(input_vswr(ladder, point, load)[0]),
        low,
        high,
        node_q(ideal, wish.at_hz, here),
        matched_yield(ladder, point, load, wish.vswr, wish.draws),
        max(float(-10.0 * np.log10(arrives[0] / into[0])), 0.0),
    )
