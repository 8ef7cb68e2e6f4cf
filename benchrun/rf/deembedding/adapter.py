"""Adapters found by two calibrations, and taken out of a calibration made through them.

Calibrating one port at its own connector and once more behind an adapter gives the adapter: the second
error box is the first one and the adapter in cascade. The product of its transmissions is then known,
and each of them for a reciprocal adapter but for the sign, which a guess of its delay decides. Common
practice ("adapter removal").
"""

from __future__ import annotations

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.rf.calibration.eight_terms import EightTerms
from benchrun.rf.terms import OnePortTerms, TwelveTerms
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["adapter_between", "without_adapter"]

_SURE_RAD = np.radians(60.0)


def _box(port: OnePortTerms) -> TwoPort:
    """Error box from source to plane, whose transmission forward is taken as one."""
    return TwoPort(port.directivity, port.tracking, np.ones_like(port.tracking), port.source_match)


def adapter_between(f_hz: FloatArray, outer: OnePortTerms, inner: OnePortTerms, delay_s: float) -> TwoPort:
    """Find an adapter between two calibrated planes of one port.

    Parameters
    ----------
    f_hz
        ``(f,)``.
    outer
        Terms at the connector without the adapter.
    inner
        Terms behind the adapter.
    delay_s
        About the adapter's delay, right to a tenth of a period of the highest frequency.

    Returns
    -------
    TwoPort
        Port 1 on the outer side.

    Raises
    ------
    InvalidMeasurement
        If the phase is too far from the guess to be sure of the sign, or the adapter is not passive.
    """
    found = _box(inner).without_left(_box(outer))
    product = found.s12 * found.s21
    s21 = np.sqrt(product)
    guess = np.exp(-2j * np.pi * f_hz * delay_s)
    s21 = np.where(np.real(s21 * np.conj(guess)) < 0.0, -s21, s21)
    off = float(np.max(np.abs(np.angle(s21 / guess))))
    if not off < _SURE_RAD:
        raise InvalidMeasurement(
            f"The adapter's phase is {np.degrees(off):.0f} degrees away from that of a delay of "
            f"{delay_s * 1e12:.4g} ps; beyond 60 degrees its sign is not sure.",
            "Give the adapter's delay more closely.",
        )
    most = float(np.max(np.abs(s21)))
    if not most < 1.1:
        raise InvalidMeasurement(
            f"The adapter comes out with a gain of {20 * np.log10(most):+.1f} dB; it can only lose.",
            "Make both calibrations again: of the same port, without touching anything but the adapter.",
        )
    return TwoPort(found.s11, s21, s21, found.s22)


def without_adapter(terms: TwelveTerms, adapter: TwoPort, port: int) -> TwelveTerms:
    """Error terms of a calibration made through an adapter, for readings made without it.

    Parameters
    ----------
    terms
        As calibrated with the adapter on ``port``.
    adapter
        Port 1 on the analyzer's side, whichever port it is on; ``(..., f)``.
    port
        1 or 2.
    """
    eight = EightTerms.of(terms)
    with_it = eight.one if port == 1 else eight.two
    box = _box(with_it).without_right(adapter)
    bare = OnePortTerms(box.s11, box.s22, box.s12 * box.s21)
    # The box of _box passes one forward with the adapter; what it passes without is the change of e10.
    if port == 1:
        changed = EightTerms(bare, eight.two, eight.k * box.s21, eight.switch, eight.leak_21, eight.leak_12)
    else:
        changed = EightTerms(eight.one, bare, eight.k / box.s21, eight.switch, eight.leak_21, eight.leak_12)
    return changed.twelve()
