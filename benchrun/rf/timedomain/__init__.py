"""What a sweep says over time: impulse and step response, gate, faults and impedance along a line.

Two ways, and they are not mixed. *Band-pass* takes any even sweep and gives the envelope of the impulse
response: where a reflection lies and how large it is, not of which sign. *Low-pass* takes a sweep whose
frequencies are multiples of its step, finds the value at 0 Hz, and gives the real impulse and step
response: the sign, and so the impedance along a line.

Times are those of the wave's way there and back for a reflection. Planes are ``(..., f)`` and results
``(..., t)``.
"""

from benchrun.rf.timedomain.fault import Fault, greatest_reflection
from benchrun.rf.timedomain.gate import gated
from benchrun.rf.timedomain.grid import Harmonics, even, harmonics
from benchrun.rf.timedomain.line import impedance_along, impedance_at
from benchrun.rf.timedomain.response import dc_by_causality, envelope, impulse, step
from benchrun.rf.timedomain.window import WINDOWS, window

__all__ = [
    "WINDOWS",
    "Fault",
    "Harmonics",
    "dc_by_causality",
    "envelope",
    "even",
    "gated",
    "greatest_reflection",
    "harmonics",
    "impedance_along",
    "impedance_at",
    "impulse",
    "step",
    "window",
]
