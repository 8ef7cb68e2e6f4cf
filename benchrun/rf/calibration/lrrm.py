r"""Line, reflect, reflect, match (LRRM): the match is read on port 1 only, and its inductance is found.

Known: the line (the kit's thru, the same from both sides), the resistance of the match, the magnitude of
the second reflect. Unknown: both reflects, of which only the sign is needed, and the inductance in series
with the match. Source: F. Purroy and L. Pradell, IEEE Trans. Instrum. Meas. 50 (5), 2001; examined by
scikit-rf's ``LRRM``.

Worked through an involution: turning a reflect from one port to the other is the map
:math:`\Gamma \to T \circ 1/\Gamma`, which is its own inverse, so two reflects determine it among the
readings; its two fixed points are known truths (plus and minus one behind a flush thru).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, ClassVar, cast

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.hookup import Hookup
from benchrun.rf.calibration.definitions import define
from benchrun.rf.calibration.method import PLAIN, Defined, Definitions, Examiner, Options, Readings
from benchrun.rf.calibration.reading import LOADS, believed, leaks, pair, reflections
from benchrun.rf.calibration.scikit_rf import Networks
from benchrun.rf.calibration.self_calibration import boxes, carried, sure_of_sign
from benchrun.rf.calibration.switch_terms import SwitchTerms
from benchrun.rf.calibration.two_port_method import TwoPortMethod
from benchrun.rf.kit import Kit
from benchrun.rf.terms import TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["LineReflectReflectMatch"]

_GREATEST_REACTANCE = 1.0

_RESOLVED = 1e-5
"""What scikit-rf's own fit of the match can resolve in noise, linear reflection."""

_HARDLY = 1e-12

_STEPS = 12
"""Newton steps for the inductance; four suffice from a per-point solution."""


@dataclass(frozen=True, slots=True, eq=False)
class _Fixed:
    """The two fixed truths, and where the readings of match and reflects lie between their readings."""

    plus: ComplexArray
    minus: ComplexArray
    match: ComplexArray
    first: ComplexArray
    second: ComplexArray

    def truth(self, place: ComplexArray, match: ComplexArray) -> ComplexArray:
        """Reflection whose reading lies at ``place``, if the match reflects ``match``."""
        zeta = (match - self.plus) / (match - self.minus) * place / self.match
        return (self.plus - self.minus * zeta) / (1.0 - zeta)


class LineReflectReflectMatch(TwoPortMethod):
    """The reflects are the kit's short and open, the second of them of known magnitude."""

    name: ClassVar[str] = "LRRM"
    standards: ClassVar[tuple[str, ...]] = ("short", "open", "load", "thru")

    def single(self, options: Options) -> tuple[str, ...]:
        """Both reflects."""
        return "short", "open"

    def takes(self, options: Options = PLAIN) -> tuple[str, ...]:
        """Two reflects, the match and the line."""
        return self.standards

    def required(
        self, ports: tuple[int, ...], isolation: bool = False, options: Options = PLAIN
    ) -> tuple[Hookup, ...]:
        """Six hook-ups, seven with isolation."""
        first, second = (tuple(Hookup.of(n, p) for n in self.single(options)) for p in (1, 2))
        rest = (LOADS, Hookup.of("thru", 1, 2)) if isolation else (Hookup.of("thru", 1, 2),)
        return (*first, Hookup.of("load", 1), *second, *rest)

    def solve(
        self,
        ports: tuple[int, ...],
        definitions: Definitions,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> TwelveTerms:
        """Fixed points, then the match by the second reflect's magnitude, then the boxes."""
        switch, leak = SwitchTerms.among(readings), leaks(readings, isolation)
        read, thru = pair(readings, "thru", switch, leak), cast(TwoPort, definitions["thru"])
        if not float(np.max(np.abs(thru.s11 - thru.s22))) < 1e-9:
            raise InvalidMeasurement(
                "The thru is defined with unlike reflections at its ends; LRRM needs one that is the same "
                "from both sides.",
                "Use a plain thru, or the LRM method with a match on both ports.",
            )
        short, opened = np.asarray(definitions["short"]), np.asarray(definitions["open"])
        load = np.asarray(definitions["load"])
        w_match = readings[Hookup.of("load", 1).text].s11
        believed((w_match,), "load on port 1")
        fixed, w_plus, w_minus = _fixed_points(
            read, thru, reflections(readings, "short", (1, 2)), reflections(readings, "open", (1, 2)),
            w_match, load, short, opened,
        )  # fmt: skip
        if not isinstance(definitions, Defined):
            raise TypeError("LRRM needs the frequencies: make the definitions with define()")
        match = _with_inductance(fixed, load, np.abs(opened), definitions.f_hz)
        for name, place, guess in (("short", fixed.first, short), ("open", fixed.second, opened)):
            sure_of_sign(fixed.truth(place, match), guess, name)
        kappa = (match - fixed.plus) / ((match - fixed.minus) * fixed.match)
        # (S - p)/(S - m) = kappa (w - w_plus)/(w - w_minus), solved for the reading w.
        d = kappa * fixed.minus * w_plus - fixed.plus * w_minus
        n = 1.0 / (kappa * fixed.minus - fixed.plus)
        a, b, c = (w_minus - kappa * w_plus) * n, d * n, (1.0 - kappa) * n
        return boxes(a, b, c, read, thru).twelve(switch, leak)

    def examiner(
        self,
        f_hz: FloatArray,
        ports: tuple[int, ...],
        kit: Kit,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> Examiner:
        """By scikit-rf's ``LRRM``, one inductance over all frequencies.

        Its fit stops at a relative 1e-8 of the sum of squares, which noise turns into more than the
        agreement asked for. So it is made twice: as it is, and with the second reflect as large as our own
        result has it, where the sum is zero and the fit exact. The second one is compared if the two
        agree on the match within what the first can resolve; otherwise the first.
        """
        from skrf.calibration import LRRM

        make = Networks(f_hz)
        names = ("short", "open", "load")
        truths = [kit.standards[n].reflection(f_hz, kit.z0_ohm) for n in names]
        # Told the inductance as well, its fit would start at nothing to add and could not move from there.
        resistance = ((1.0 + truths[2]) / (1.0 - truths[2])).real
        truths[2] = np.asarray((resistance - 1.0) / (resistance + 1.0), np.complex128)
        match = readings[Hookup.of("load", 1).text].s11

        # Behind a thru of no length and no loss one coefficient of its first guess is zero, and it divides by
        # it; a loss of 1e-12 gives it a guess and changes nothing that could be seen.
        thru = kit.standards["thru"].two_port(f_hz, kit.z0_ohm)
        thru = TwoPort(thru.s11, thru.s12 * (1.0 - _HARDLY), thru.s21 * (1.0 - _HARDLY), thru.s22)

        def fitted(second: ComplexArray) -> Any:
            calibration = LRRM(
                measured=[
                    make.through(readings, "thru"),
                    *(make.reflect(readings, n, isolation) for n in names[:2]),
                    make.hanging(match, match, readings, isolation),
                ],
                ideals=[
                    make.two(thru),
                    *(make.both(t, t) for t in (truths[0], second, truths[2])),
                ],
                **make.given(readings, isolation),
            )
            calibration.run()
            return calibration

        ours = self.solve(ports, define(kit, self.takes(options), f_hz), readings, isolation, options)
        found = ours.forward.port.correct(readings[Hookup.of("open", 1).text].s11)
        first = fitted(truths[1])
        second = fitted(np.asarray(truths[1] * np.abs(found / truths[1])))
        same = float(np.max(np.abs(first.solved_m.s - second.solved_m.s))) < _RESOLVED
        calibration = second if same else first
        return lambda raw: TwoPort.of(calibration.apply_cal(make.two(raw)).s)


def _fixed_points(
    read: TwoPort,
    thru: TwoPort,
    shorts: list[ComplexArray],
    opens: list[ComplexArray],
    w_match: ComplexArray,
    match: ComplexArray,
    short: ComplexArray,
    opened: ComplexArray,
) -> tuple[_Fixed, ComplexArray, ComplexArray]:
    plus, minus = _roots(np.ones_like(thru.s21), -(thru.s11 + thru.s22), thru.determinant)
    swap = np.abs(minus - thru.s21) < np.abs(plus - thru.s21)
    plus, minus = np.where(swap, minus, plus), np.where(swap, plus, minus)
    p1, p2 = shorts[0], opens[0]
    q1, q2 = 1.0 / carried(read, shorts[1]), 1.0 / carried(read, opens[1])
    s1, s2, r1, r2 = p1 + q1, p2 + q2, p1 * q1, p2 * q2
    if not float(np.min(np.abs(p1 - p2))) > 1e-3:
        raise InvalidMeasurement(
            f"The readings of short and open on port 1 differ by only {np.min(np.abs(p1 - p2)):.1e} "
            "somewhere in the sweep, so they cannot be two standards.",
            "Connect each of them once more and read both again.",
        )
    w_plus, w_minus = _roots(s1 - s2, -2.0 * (r1 - r2), r1 * s2 - s1 * r2)

    def place(w: ComplexArray) -> ComplexArray:
        return (w - w_plus) / (w - w_minus)

    found = _Fixed(plus, minus, place(w_match), place(p1), place(p2))
    other = _Fixed(plus, minus, 1.0 / found.match, 1.0 / found.first, 1.0 / found.second)

    def far(fixed: _Fixed) -> FloatArray:
        one, two = fixed.truth(fixed.first, match), fixed.truth(fixed.second, match)
        return np.asarray(np.abs(one - short) + np.abs(two - opened))

    turn = far(other) < far(found)
    chosen = _Fixed(
        plus,
        minus,
        *(np.where(turn, getattr(other, n), getattr(found, n)) for n in ("match", "first", "second")),
    )
    return chosen, np.where(turn, w_minus, w_plus), np.where(turn, w_plus, w_minus)


def _roots(a: ComplexArray, b: ComplexArray, c: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
    disc = np.sqrt(b * b - 4.0 * a * c)
    q = -0.5 * (b + np.where(np.real(np.conj(b) * disc) < 0.0, -disc, disc))
    return q / a, c / q


def _with_inductance(fixed: _Fixed, load: ComplexArray, size: FloatArray, f_hz: FloatArray) -> ComplexArray:
    """Match whose series inductance makes the second reflect as large as it is known to be.

    Least squares over the sweep of ``size - |second reflect|``, one inductance for all frequencies, by
    Newton steps from the frequency-weighted mean of the solutions at each point.
    """
    r, x0 = (zeta := (1.0 + load) / (1.0 - load)).real, zeta.imag
    rho, grow = fixed.second / fixed.match, f_hz / f_hz[-1]
    # (match - plus) / (match - minus) = (n1 x + n0) / (d1 x + d0), with x the reactance over z0.
    n0, n1 = r * (1.0 - fixed.plus) - (1.0 + fixed.plus), 1j * (1.0 - fixed.plus)
    d0, d1 = r * (1.0 - fixed.minus) - (1.0 + fixed.minus), 1j * (1.0 - fixed.minus)
    p0, p1 = fixed.plus * d0 - fixed.minus * rho * n0, fixed.plus * d1 - fixed.minus * rho * n1
    q0, q1 = d0 - rho * n0, d1 - rho * n1
    g2 = size**2
    a = np.abs(p1) ** 2 - g2 * np.abs(q1) ** 2
    b = 2.0 * np.real(np.conj(p0) * p1 - g2 * np.conj(q0) * q1)
    c = np.abs(p0) ** 2 - g2 * np.abs(q0) ** 2
    root = np.sqrt(np.maximum(b * b - 4.0 * a * c, 0.0))
    half = -0.5 * (b + np.where(b < 0.0, -root, root))
    tiny = np.finfo(float).tiny
    one, two = half / np.where(a == 0.0, tiny, a), c / np.where(half == 0.0, tiny, half)
    each = np.where(np.abs(one - x0) <= np.abs(two - x0), one, two)
    t = np.sum(each, axis=-1, keepdims=True) / np.sum(grow)
    for _ in range(_STEPS):
        x = grow * t
        p, q = p1 * x + p0, q1 * x + q0
        found = np.abs(p / q)
        slope = found * np.real(p1 / p - q1 / q) * grow
        t = t + np.sum(slope * (size - found), -1, keepdims=True) / np.sum(slope**2, -1, keepdims=True)
    z = r + 1j * grow * t
    if not float(np.max(np.abs(z.imag))) < _GREATEST_REACTANCE:
        raise InvalidMeasurement(
            f"The match comes out with a reactance of {np.max(np.abs(z.imag)):.3g} times the reference "
            f"impedance at the end of the sweep; at most {_GREATEST_REACTANCE:g} is believed.",
            "See that the load was on port 1 and short and open were not exchanged, and read them again.",
        )
    return np.asarray((z - 1.0) / (z + 1.0))
