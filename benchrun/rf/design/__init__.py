"""The bench's pencil: filters from prototypes, matching networks, and what to expect of them.

Ideal values first, then parts that can be bought (E series, tolerance, Q), the response predicted for them,
and a mask derived from it. Independent of the simulated bench, which has its own models.
"""

from benchrun.rf.design.eseries import SERIES, TOLERANCE, nearest, neighbours
from benchrun.rf.design.ladder import Ladder
from benchrun.rf.design.matched import input_vswr, load_over, matched_band, matched_yield, node_q
from benchrun.rf.design.matching import l_sections, pi_sections, stubs, tee_sections
from benchrun.rf.design.parts import Branch, Element, Line, Part, Stub
from benchrun.rf.design.prototype import Prototype, bessel, butterworth, chebyshev
from benchrun.rf.design.transform import band_pass, band_stop, high_pass, low_pass

__all__ = [
    "SERIES",
    "TOLERANCE",
    "Branch",
    "Element",
    "Ladder",
    "Line",
    "Part",
    "Prototype",
    "Stub",
    "band_pass",
    "band_stop",
    "bessel",
    "butterworth",
    "chebyshev",
    "high_pass",
    "input_vswr",
    "l_sections",
    "load_over",
    "low_pass",
    "matched_band",
    "matched_yield",
    "nearest",
    "neighbours",
    "node_q",
    "pi_sections",
    "stubs",
    "tee_sections",
]
