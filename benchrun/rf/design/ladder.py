r"""A circuit between two resistances, and the S-parameters predicted for it.

Chain matrices are multiplied from port 1 on and turned into scattering parameters between the terminations
:math:`R_1, R_2` (any microwave text; the determinant is kept, so losses and lines come out reciprocal):
:math:`S_{21} = 2\sqrt{R_1 R_2} / (A R_2 + B + C R_1 R_2 + D R_1)`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from benchrun.rf.design.eseries import TOLERANCE, nearest
from benchrun.rf.design.parts import Branch, Element, Part
from benchrun.rf.masks import Mask, band_mask
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["Ladder"]

_FLOOR_DB = -200.0


@dataclass(frozen=True, slots=True)
class Ladder:
    """Elements from port 1 to port 2.

    Parameters
    ----------
    name
        In words.
    elements
        In turn.
    source_ohm, load_ohm
        Terminations, real: what the S-parameters refer to at port 1 and port 2.
    """

    name: str
    elements: tuple[Element, ...]
    source_ohm: float = 50.0
    load_ohm: float = 50.0

    @property
    def parts(self) -> tuple[Part, ...]:
        """All lumped parts in turn."""
        return tuple(p for e in self.elements if isinstance(e, Branch) for p in e.parts)

    def response(self, f_hz: FloatArray, factors: FloatArray | None = None) -> TwoPort:
        """Predict the S-parameters.

        Parameters
        ----------
        f_hz
            ``(f,)``.
        factors
            What each value is multiplied by, ``(..., k)``, in the order of the elements and their parts;
            None for the nominal values.

        Returns
        -------
        TwoPort
            Planes ``(..., f)``, port 1 referred to ``source_ohm``, port 2 to ``load_ohm``.

        Examples
        --------
        >>> import numpy as np
        >>> pad = Ladder("half", (Branch("series", (Part("resistor", 100.0),)),))
        >>> abs(pad.response(np.array([1e8])).s21).tolist()
        [0.5]
        """
        spread = [e.varying for e in self.elements]
        if factors is None:
            factors = np.ones(sum(len(v) for v in spread))
        a, b = np.ones(f_hz.shape, complex), np.zeros(f_hz.shape, complex)
        c, d = np.zeros(f_hz.shape, complex), np.ones(f_hz.shape, complex)
        first = 0
        for element, varying in zip(self.elements, spread, strict=True):
            p, q, r, s = element.chain(f_hz, factors[..., first : first + len(varying)])
            a, b, c, d = a * p + b * r, a * q + b * s, c * p + d * r, c * q + d * s
            first += len(varying)
        r1, r2 = self.source_ohm, self.load_ohm
        under = 1.0 / (a * r2 + b + c * (r1 * r2) + d * r1)
        through = np.asarray(2.0 * np.sqrt(r1 * r2) * under)
        # Every element here is reciprocal, so the determinant of the chain is 1: worked out, it would only
        # lose digits where the filter stops.
        return TwoPort(
            np.asarray((a * r2 + b - c * (r1 * r2) - d * r1) * under),
            through,
            through.copy(),
            np.asarray((-a * r2 + b - c * (r1 * r2) + d * r1) * under),
        )

    def with_parts(self, change: Callable[[Part], Part]) -> Ladder:
        """Change each lumped part."""
        elements = tuple(
            replace(e, parts=tuple(change(p) for p in e.parts)) if isinstance(e, Branch) else e
            for e in self.elements
        )
        return replace(self, elements=elements)

    def real(
        self,
        coils: str = "E24",
        capacitors: str = "E24",
        coil_q: tuple[float, float] | None = None,
        capacitor_q: tuple[float, float] | None = None,
        tolerance: float | None = None,
    ) -> Ladder:
        """Take parts that can be bought: preferred values, tolerance, Q.

        Parameters
        ----------
        coils, capacitors
            Series for each; resistors take that of the capacitors.
        coil_q, capacitor_q
            Q and the frequency at which it is meant; None for ideal parts.
        tolerance
            Relative; None for the one that goes with the series.
        """

        def bought(part: Part) -> Part:
            series = coils if part.kind == "coil" else capacitors
            q = {"coil": coil_q, "capacitor": capacitor_q}.get(part.kind)
            spread = TOLERANCE[series] if tolerance is None else tolerance
            q_value, q_hz = q if q is not None else (part.q, part.q_hz)
            return Part(part.kind, nearest(part.value, series), spread, q_value, q_hz)

        return self.with_parts(bought)

    def factors(self, draws: int, seed: int) -> FloatArray:
        """Draw values within their tolerances, evenly (rectangular, JCGM 101:2008, 6.4.2), ``(draws, k)``.

        Makers sort, so values need not crowd around the nominal one; even is the careful assumption.
        """
        spread = np.array([t for e in self.elements for t in e.varying])
        return 1.0 + spread * np.random.default_rng(seed).uniform(-1.0, 1.0, (draws, len(spread)))

    def draws(self, f_hz: FloatArray, draws: int, seed: int) -> TwoPort:
        """S-parameters of so many pieces built, planes ``(draws, f)``; the same seed gives the same."""
        return self.response(f_hz, self.factors(draws, seed))

    def expected(
        self, f_hz: FloatArray, trace: str = "S21", draws: int = 1000, seed: int = 1, guard_db: float = 0.0
    ) -> Mask:
        """Derive a mask: the corridor that every piece drawn stays in, widened by a guard.

        Parameters
        ----------
        f_hz
            Corners of the mask, ``(k,)``, at least two.
        trace
            ``"S11"`` to ``"S22"``.
        draws, seed
            Pieces drawn; the extremes of 1000 leave about one piece in 500 outside at each frequency.
        guard_db
            For what the prediction does not know (layout, stray parts), not negative.

        Raises
        ------
        ValueError
            For a negative guard, which could close the corridor.
        """
        if guard_db < 0:
            raise ValueError(f"a guard of {guard_db:g} dB would close the corridor; it must not be negative")
        nominal = _decibels(self.response(f_hz).parameter(trace))
        level = _decibels(self.draws(f_hz, draws, seed).parameter(trace))
        lower = np.minimum(level.min(0), nominal) - guard_db
        upper = np.maximum(level.max(0), nominal) + guard_db
        return band_mask(f"{self.name}, {trace} as designed", f_hz, lower, upper)

    def fraction_within(self, f_hz: FloatArray, masks: dict[str, Mask], draws: int, seed: int) -> float:
        """Share of pieces drawn that keep all masks (by trace) at the frequencies ``(f,)``: the yield."""
        built = self.draws(f_hz, draws, seed)
        good = np.ones(draws, bool)
        for trace, mask in masks.items():
            level = _decibels(built.parameter(trace))
            for line in mask.lines:
                inside = line.inside(f_hz)
                limit = line.limit_at(f_hz[inside])
                part = level[:, inside]
                good &= np.all(part <= limit if line.side == "at most" else part >= limit, axis=-1)
        return float(good.mean())


def _decibels(plane: ComplexArray) -> FloatArray:
    return np.asarray(20.0 * np.log10(np.maximum(np.abs(plane), 10.0 ** (_FLOOR_DB / 20.0))))
