"""The eight-term model: one error box a port, the ratio of their transmissions, and two switch terms.

Source: R. B. Marks, 50th ARFTG Conference, 1997, equations 36-44, as in scikit-rf's
``convert_12term_2_8term`` and ``convert_8term_2_12term``; written here without its limits at zero
switch terms, which cancel.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.rf.calibration.switch_terms import NO_SWITCH, SwitchTerms
from benchrun.rf.terms import Direction, OnePortTerms, TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["EightTerms", "k_disagreement", "k_estimates", "twelve_of"]


@dataclass(frozen=True, slots=True, eq=False)
class EightTerms:
    """Error boxes of both ports.

    Parameters
    ----------
    one, two
        Directivity, source match and reflection tracking of port 1 and of port 2.
    k
        Ratio ``e10/e23`` of the transmissions from source to unit, port 1 over port 2.
    switch
        What the idle ports reflect.
    leak_21, leak_12
        Isolation terms of the readings.
    """

    one: OnePortTerms
    two: OnePortTerms
    k: ComplexArray
    switch: SwitchTerms = NO_SWITCH
    leak_21: ComplexArray | complex = 0.0
    leak_12: ComplexArray | complex = 0.0

    @classmethod
    def of(cls, terms: TwelveTerms) -> EightTerms:
        """From twelve terms; ``k`` by its forward estimate, see :func:`k_disagreement`."""
        f, r = terms.forward, terms.reverse
        switch, k = SwitchTerms.of(terms), k_estimates(terms)[0]
        return cls(f.port, r.port, k, switch, f.isolation, r.isolation)

    def twelve(self) -> TwelveTerms:
        """As twelve terms, by which readings are corrected."""
        ahead, back = self.two.tracking * self.k, self.one.tracking / self.k
        return twelve_of(self.one, self.two, ahead, back, self.switch, (self.leak_21, self.leak_12))

    def correct(self, m: TwoPort) -> TwoPort:
        """Turn raw readings into true S-parameters."""
        return self.twelve().correct(m)

    def embed(self, s: TwoPort) -> TwoPort:
        """Turn true S-parameters into raw readings."""
        return self.twelve().embed(s)

    def renormalised(self, g: ComplexArray | complex) -> EightTerms:
        r"""Terms that give S-parameters in another reference impedance, the same on both ports.

        Parameters
        ----------
        g
            :math:`(Z_{old} - Z_{new}) / (Z_{old} + Z_{new})`, the old impedance seen in the new one.

        Notes
        -----
        A reflection changes by :math:`\Gamma_{old} = (\Gamma_{new} - g)/(1 - g \Gamma_{new})`, which is the
        same for pseudo-waves (Marks and Williams, J. Res. NIST 97, 1992, from memory) and, since both ports
        change alike, leaves no freedom in the transmissions.
        """
        step = (1.0 - g**2) / ((1.0 + self.one.source_match * g) * (1.0 + self.two.source_match * g))
        one, two = _renormalise_port(self.one, g), _renormalise_port(self.two, g)
        k = self.k * self.two.tracking * step / two.tracking
        return EightTerms(one, two, k, self.switch, self.leak_21, self.leak_12)


def twelve_of(
    one: OnePortTerms,
    two: OnePortTerms,
    ahead: ComplexArray,
    back: ComplexArray,
    switch: SwitchTerms = NO_SWITCH,
    leak: tuple[ComplexArray | complex, ComplexArray | complex] = (0.0, 0.0),
) -> TwelveTerms:
    """Twelve terms of two error boxes.

    Parameters
    ----------
    one, two
        Reflection terms of port 1 and of port 2.
    ahead, back
        Transmissions ``e10 e32`` and ``e23 e01`` with matched idle ports.
    switch
        What the idle ports reflect.
    leak
        Isolation forward and reverse.
    """
    load, other = two.source_match, one.source_match
    if not switch.absent:
        onto_two = 1.0 / (1.0 - two.directivity * switch.forward)
        onto_one = 1.0 / (1.0 - one.directivity * switch.reverse)
        load = load + two.tracking * switch.forward * onto_two
        other = other + one.tracking * switch.reverse * onto_one
        ahead, back = ahead * onto_two, back * onto_one
    return TwelveTerms(
        Direction(one.directivity, one.source_match, one.tracking, load, ahead, leak[0]),
        Direction(two.directivity, two.source_match, two.tracking, other, back, leak[1]),
    )


def _renormalise_port(port: OnePortTerms, g: ComplexArray | complex) -> OnePortTerms:
    # M = (a S + b) / (c S + 1), with the old S put in as a function of the new one.
    c, b = -port.source_match, port.directivity
    a = port.tracking + b * c
    n = 1.0 / (1.0 - c * g)
    return OnePortTerms((b - a * g) * n, -(c - g) * n, port.tracking * (1.0 - g**2) * n**2)


def k_estimates(terms: TwelveTerms) -> tuple[ComplexArray, ComplexArray]:
    """``e10/e23`` twice over: from the forward transmission term and from the reverse one.

    Source: Marks 1997, as above: ``k = eT / (eR' + eD' (eL - eS'))`` and
    ``1/k = eT' / (eR + eD (eL' - eS))``. Both are arrays ``(..., f)``.
    """
    f, r = terms.forward, terms.reverse
    forward = f.transmission / (r.tracking + r.directivity * (f.load_match - r.source_match))
    reverse = (f.tracking + f.directivity * (r.load_match - f.source_match)) / r.transmission
    return forward, reverse


def k_disagreement(terms: TwelveTerms) -> FloatArray:
    """How far the two estimates of ``k`` lie apart, relative to it, linear.

    Zero where twelve terms describe one pair of error boxes; a loose connector between the standards and
    the thru, a wrong thru definition or a thru that is not reciprocal shows here, for nothing.

    Examples
    --------
    >>> import numpy as np
    >>> c = lambda x: np.array([complex(x)])
    >>> ideal = Direction(c(0), c(0), c(1), c(0), c(1))
    >>> off = Direction(c(0), c(0), c(1), c(0), c(1.02))
    >>> round(float(k_disagreement(TwelveTerms(ideal, off))[0]), 4)
    0.02
    """
    forward, reverse = k_estimates(terms)
    return np.asarray(np.abs(forward / reverse - 1.0))
