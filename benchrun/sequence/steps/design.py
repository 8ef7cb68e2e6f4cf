"""A designed ladder as a sequence writes it: part by part, or from a prototype."""

from __future__ import annotations

import re
from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field, WithJsonSchema, model_validator

from benchrun.quantity import Dimension, QuantityError, parse
from benchrun.rf.design import (
    Branch,
    Ladder,
    Part,
    Prototype,
    band_pass,
    band_stop,
    bessel,
    butterworth,
    chebyshev,
    high_pass,
    low_pass,
    nearest,
)
from benchrun.sequence.fields import Decibel, FileModel, Frequency, FrequencyRange, Impedance, Listed, trouble

__all__ = ["Design"]

_KINDS = {
    "H": ("coil", Dimension.INDUCTANCE),
    "F": ("capacitor", Dimension.CAPACITANCE),
    "ohm": ("resistor", Dimension.IMPEDANCE),
}


def _part(text: object) -> tuple[str, float]:
    """Read one part: its unit says what it is."""
    unit = re.search(r"(H|F|ohm)\s*$", str(text))
    if unit is None:
        raise ValueError(
            f"{text!r} is no part; write a coil as in 43 nH, a capacitor 12 pF, a resistor 50 ohm"
        )
    kind, dimension = _KINDS[unit[1]]
    try:
        value = parse(text, dimension)
    except QuantityError as error:
        raise ValueError(str(error)) from None
    if not value > 0:
        raise ValueError(f"{text!r}: a {kind} has a value above 0")
    return kind, value


def _parts(value: object) -> object:
    return tuple(_part(one) for one in value) if isinstance(value, list) else (_part(value),)


_ONE: dict[str, Any] = {"type": "string", "examples": ["43 nH", "12 pF", "50 ohm"]}
Parts = Annotated[
    tuple[tuple[str, float], ...],
    BeforeValidator(_parts),
    Field(min_length=1, max_length=4),
    WithJsonSchema({"anyOf": [_ONE, {"type": "array", "items": _ONE, "minItems": 1, "maxItems": 4}]}),
]


class Piece(FileModel):
    """What stands in the way, or from it to ground."""

    series: Parts | None = None
    shunt: Parts | None = None
    joined: Literal["series", "parallel"] = Field(default="series", description="of several parts")

    @model_validator(mode="after")
    def _one_place(self) -> Piece:
        if (self.series is None) == (self.shunt is None):
            raise trouble("stands in `series` or in `shunt`; write one of them")
        return self


class Shape(FileModel):
    """A filter from its prototype."""

    shape: Literal["butterworth", "chebyshev", "bessel"]
    order: int = Field(ge=1, le=60)
    ripple: Decibel | None = Field(default=None, description="of a chebyshev, in its pass band")
    filter: Literal["low-pass", "high-pass", "band-pass", "band-stop"] = "low-pass"
    corner: Frequency | None = Field(default=None, description="of a low-pass or high-pass")
    band: FrequencyRange | None = Field(default=None, description="of a band-pass or band-stop")

    @model_validator(mode="after")
    def _fits(self) -> Shape:
        if (self.ripple is None) == (self.shape == "chebyshev"):
            raise trouble("`ripple` belongs to a chebyshev, and a chebyshev needs one")
        banded = self.filter in ("band-pass", "band-stop")
        if (self.band is None) == banded or (self.corner is None) != banded:
            raise trouble(f"a {self.filter} needs `{'band' if banded else 'corner'}` and nothing else")
        return self

    def build(self, source_ohm: float, load_ohm: float) -> Ladder:
        """The ideal ladder.

        Raises
        ------
        ValueError
            If there is none between these terminations.
        """
        load = load_ohm / source_ohm
        if self.shape == "chebyshev":
            even = self.order % 2 == 0 and load == 1.0
            prototype: Prototype = chebyshev(self.order, self.ripple or 0.0, None if even else load)
        else:
            prototype = (
                butterworth(self.order, load) if self.shape == "butterworth" else bessel(self.order, load)
            )
        if self.band is not None:
            return (band_pass if self.filter == "band-pass" else band_stop)(prototype, *self.band, source_ohm)
        return (low_pass if self.filter == "low-pass" else high_pass)(
            prototype, self.corner or 0.0, source_ohm
        )


_SERIES = Literal["E3", "E6", "E12", "E24", "E48", "E96", "E192"]


class Design(FileModel):
    """A ladder between two resistances, with the spread of its parts."""

    elements: Annotated[tuple[Piece, ...], Listed] | None = Field(
        default=None, min_length=1, max_length=100, description="from port 1 to port 2"
    )
    prototype: Shape | None = None
    source: Impedance = Field(default=50.0, description="termination at port 1")
    load: Impedance = Field(default=50.0, description="termination at port 2")
    coils: _SERIES | None = Field(default=None, description="preferred values of the coils")
    capacitors: _SERIES | None = Field(default=None, description="preferred values of capacitors, resistors")
    coil_q: float | None = Field(default=None, alias="coil q", gt=0)
    capacitor_q: float | None = Field(default=None, alias="capacitor q", gt=0)
    q_at: Frequency | None = Field(default=None, alias="q at", gt=0, description="where the Q holds")
    tolerance: float = Field(gt=0, lt=1, description="of every part, relative: 0.02 for 2 %")

    @model_validator(mode="after")
    def _builds(self) -> Design:
        if (self.elements is None) == (self.prototype is None):
            raise trouble("has `elements` and a `prototype` both or not at all; keep one")
        if (self.q_at is None) != (self.coil_q is None and self.capacitor_q is None):
            raise trouble("`q at` belongs to `coil q` and `capacitor q`")
        try:
            self.ladder  # noqa: B018 - what cannot be built is told now
        except ValueError as error:
            raise trouble(str(error)) from None
        return self

    @property
    def ladder(self) -> Ladder:
        """With parts of preferred value where series are named, their Q and tolerance."""
        if self.prototype is not None:
            ideal = self.prototype.build(self.source, self.load)
        else:
            branches = []
            for piece in self.elements or ():
                place, parts = (
                    ("series", piece.series) if piece.series is not None else ("shunt", piece.shunt)
                )
                branches.append(Branch(place, tuple(Part(k, v) for k, v in parts or ()), piece.joined))
            ideal = Ladder("ladder", tuple(branches), self.source, self.load)
        qs = {"coil": self.coil_q, "capacitor": self.capacitor_q}

        def made(part: Part) -> Part:
            q = qs.get(part.kind)
            spread = (q, self.q_at or 0.0) if q is not None else (part.q, part.q_hz)
            series = self.coils if part.kind == "coil" else self.capacitors
            value = part.value if series is None else nearest(part.value, series)
            return Part(part.kind, value, self.tolerance, *spread)

        return ideal.with_parts(made)
