"""An amplifier stage: gain, match, compression, intercept, noise, supply."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.parts.base import Part, Stage, Surroundings, known_keys, unknown_fault
from sim_instruments.values import number
from sim_instruments.waves import Matrix, Real, two

__all__ = ["amplifier", "compression"]

_SHARPNESS = 2.0


def compression(incident_dbm: Real, gain_db: float, p1db_dbm: float) -> Real:
    """What is left of the voltage gain: ``(1 + (x / x_sat)^p)^(-1/2p)`` in powers (Rapp 1991, from memory).

    It is 1 far below, exactly -1 dB where the output reaches ``p1db_dbm``, and holds the output far above.

    Parameters
    ----------
    incident_dbm
        At the input, ``(f,)``.
    gain_db
        Small-signal.
    p1db_dbm
        At the output.

    Examples
    --------
    >>> round(float(20 * np.log10(compression(np.array(5.0), 16.0, 20.0))), 9)
    -1.0
    """
    p = _SHARPNESS
    at_1db = (10 ** (0.1 * p) - 1) ** (1 / p)
    over = 10 ** ((incident_dbm - (p1db_dbm - gain_db + 1.0)) / 10) * at_1db
    return np.asarray((1 + over**p) ** (-1 / (2 * p)), np.float64)


def amplifier(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A stage; port 1 is its input.

    Parameters
    ----------
    spec
        ``gain`` (dB) at ``at``, falling 6 dB an octave far above ``corner``; ``input`` and ``output`` return
        loss, ``reverse`` isolation (dB); ``P1dB``, ``IP3`` (dBm at the output; IP3 10.6 dB above P1dB if not
        given, as a cubic nonlinearity has it), ``noise figure`` (dB); ``supply`` (V), ``current`` (A);
        ``spread``: standard deviation of the gain in dB; ``drift``: gain in dB/K; ``faults``: ``"gain -3
        dB"``, ``"P1dB -4 dB"`` or ``"noise figure +3 dB"``.
    draws
        What makes this specimen.

    Raises
    ------
    ValueError
        For another fault.
    """
    known_keys(
        spec, "gain", "at", "corner", "input", "output", "reverse", "P1dB", "IP3", "noise figure", "supply",
        "current", "spread", "drift",
    )  # fmt: skip
    value = {
        "gain": number(spec["gain"]),
        "P1dB": number(spec["P1dB"]),
        "noise figure": number(spec["noise figure"]),
    }
    for fault in spec.get("faults", ()):
        found = re.fullmatch(r"(gain|P1dB|noise figure) ([+-][\d.]+) dB", str(fault))
        if found is None:
            raise unknown_fault(fault, ("gain -3 dB", "P1dB -4 dB", "noise figure +3 dB"))
        value[found[1]] += float(found[2])
    gain_db = value["gain"] + draws.normal("gain", number(spec.get("spread", 0.0)))
    ip3 = number(spec["IP3"]) if "IP3" in spec else value["P1dB"] + 10.6
    volts = number(spec["supply"])
    stage = Stage(gain_db, value["P1dB"], ip3, value["noise figure"], volts, number(spec["current"]))
    at, corner = number(spec["at"]), number(spec["corner"])
    drift = number(spec.get("drift", 0.0))
    match = [10 ** (-abs(number(spec[k])) / 20) for k in ("input", "output", "reverse")]
    turn = [draws.phase(k) for k in ("input", "output", "reverse")]

    def fed(around: Surroundings) -> float:
        return 1.0 if around.supply_v is None else max(around.supply_v, 0.0) / volts

    def gain_now_db(around: Surroundings) -> float:
        share = fed(around)
        if share < 0.2:
            return -40.0
        return gain_db + drift * (around.temperature_c - 23.0) + 14.0 * math.log10(min(share, 1.0))

    def response(f_hz: Real, around: Surroundings) -> Matrix:
        s21 = -(10 ** (gain_now_db(around) / 20)) * np.hypot(1, at / corner) / (1 + 1j * f_hz / corner)
        s11, s22, s12 = (
            m * t * np.exp(-2j * np.pi * f_hz * 0.2e-9) for m, t in zip(match, turn, strict=True)
        )
        return two(s11, s12, np.asarray(s21), s22)

    def gain_factor(f_hz: Real, around: Surroundings, incident_dbm: Real) -> Real:
        rolled = 20 * np.log10(np.hypot(1, at / corner) / np.hypot(1, f_hz / corner))
        less = 20 * np.log10(max(min(fed(around), 1.0), 0.05))
        return compression(incident_dbm + rolled, gain_now_db(around), stage.p1db_dbm + less)

    return Part(2, response, "amplifier", gain_factor=gain_factor, stage=stage)
