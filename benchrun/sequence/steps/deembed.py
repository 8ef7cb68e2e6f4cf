"""Step ``de-embed``: move the reference planes from where the analyzer was calibrated to the unit.

One step does one thing: fixture halves from files, halves split from a 2x-thru, dummies, an adapter, a shift
of the planes, or another reference impedance. Orientation, as the signal goes from port 1 to port 2::

    analyzer port 1 --[1  left  2]--[1  unit  2]--[1  right  2]-- analyzer port 2
    analyzer port p --[1 adapter 2]-- the calibrated plane of port p, whichever port it is
"""

from __future__ import annotations

import re
from typing import Annotated, Any, ClassVar, Literal

from pydantic import BeforeValidator, Field, WithJsonSchema, model_validator

from benchrun.quantity import Dimension, parse
from benchrun.rf.deembedding.plane import Extension
from benchrun.sequence.fields import Decibel, Delay, FileModel, Frequency, Name, trouble
from benchrun.sequence.steps.base import StepModel

__all__ = ["Adapter", "DeEmbed", "Dummies", "Shift", "TwoThru", "impedance_of", "ohm_text"]

_COMPLEX = re.compile(r"\s*([-+0-9.eE]+?)\s*([-+])\s*([0-9.eE]+)j\s*(ohm|Ω)\s*")


def impedance_of(value: object) -> complex:
    """Read one impedance: ``75 ohm`` or ``73 + 42j ohm``.

    Raises
    ------
    ValueError
        If it is none, or has no resistance above zero.

    Examples
    --------
    >>> impedance_of("73 - 42.5j ohm")
    (73-42.5j)
    """
    if isinstance(value, complex):
        return value
    if isinstance(value, str) and (match := _COMPLEX.fullmatch(value)):
        try:
            found = complex(float(match[1]), float(match[2] + match[3]))
        except ValueError:
            raise ValueError(f"{value!r} is no impedance; write it as in 73 + 42.5j ohm") from None
    else:
        found = complex(parse(value, Dimension.IMPEDANCE), 0.0)
    if not found.real > 0:
        raise ValueError(f"{value!r} is no such impedance; its resistance must be above 0 ohm")
    return found


def _ports_ohm(value: object) -> object:
    if isinstance(value, list | tuple):
        if len(value) != 2:
            raise ValueError(
                f"names {len(value)} impedances; write one for both ports, or one for each of two"
            )
        return (impedance_of(value[0]), impedance_of(value[1]))
    return (impedance_of(value), impedance_of(value))


_ONE_OHM: dict[str, Any] = {"type": "string", "examples": ["75 ohm", "73 + 42.5j ohm"]}
PortsOhm = Annotated[
    tuple[complex, complex],
    BeforeValidator(_ports_ohm),
    WithJsonSchema({"anyOf": [_ONE_OHM, {"type": "array", "items": _ONE_OHM, "minItems": 2, "maxItems": 2}]}),
]


class TwoThru(FileModel):
    """Halves of a 2x-thru, after IEEE 370-2020."""

    file: str = Field(min_length=1, description="Touchstone file of both halves joined")
    follow_impedance: bool = Field(
        default=False,
        alias="follow impedance",
        description="correct the halves by the impedance that the reading itself shows along the line",
    )
    fixture_class: Literal["A", "B", "C"] | None = Field(
        default=None, alias="class", description="least electrical class of the 2x-thru"
    )
    quality: Literal["good", "acceptable", "inconclusive"] | None = Field(
        default=None, description="least grade of its causality, passivity and reciprocity"
    )


class Dummies(FileModel):
    """On-board structures without the unit, as Touchstone files."""

    open: str | None = Field(default=None, description="pads without the unit")
    short: str | None = Field(default=None, description="leads joined to ground at the unit's place")
    thru: str | None = Field(default=None, description="leads joined through")
    first: Literal["open", "short"] = Field(default="open", description="what is outermost: pads or leads")
    circuit: Literal["pi", "tee"] = Field(default="pi", description="how the thru is split")

    @model_validator(mode="after")
    def _some(self) -> Dummies:
        if self.thru is not None and (self.open is not None or self.short is not None):
            raise trouble(
                "`thru` is split in two halves and stands alone; leave out `open` and `short`", "thru"
            )
        if self.thru is None and self.open is None and self.short is None:
            raise trouble("names no dummy; name `open`, `short` or both, or `thru`")
        return self


class Adapter(FileModel):
    """An adapter that was there while calibrating and is away while the unit is read."""

    port: Literal[1, 2]
    file: str | None = Field(
        default=None, description="Touchstone file; its port 1 is on the analyzer's side"
    )
    without: Name | None = Field(default=None, description="a calibration of this port without the adapter")
    behind: Name | None = Field(default=None, description="a calibration of this port behind the adapter")
    delay: Delay | None = Field(default=None, description="about its delay; decides the sign")

    @model_validator(mode="after")
    def _known(self) -> Adapter:
        found = (self.without, self.behind, self.delay)
        if self.file is not None and any(x is not None for x in found):
            raise trouble("names a `file` and calibrations to find the adapter by; keep one of them", "file")
        if self.file is None and any(x is None for x in found):
            raise trouble("needs a `file`, or two calibrations (`without`, `behind`) and the `delay`")
        return self


class Shift(FileModel):
    """The stretch of matched line by which one plane is moved towards the unit."""

    delay: Delay = Field(description="one way")
    away: bool = Field(default=False, description="move the plane away from the unit instead")
    loss: Decibel = Field(default=0.0, ge=0, description="one way; grows with the root of frequency")
    at: Frequency = Field(default=1e9, gt=0, description="frequency at which the loss holds")

    @property
    def extension(self) -> Extension:
        """As numbers."""
        sign = -1.0 if self.away else 1.0
        return Extension(sign * self.delay, sign * self.loss, self.at)


Port = Annotated[int, Field(ge=1, le=2)]
_WAYS = ("left", "right", "2x-thru", "dummies", "adapter", "shift", "renormalise")


class DeEmbed(StepModel):
    """Move the reference planes from the cable ends to the unit."""

    kind: ClassVar[str] = "de-embed"
    leaves: ClassVar[str] = "network"

    name: Name = Field(alias="as", description="name under which later steps refer to this result")
    from_: Name = Field(alias="from", description="the result to take the fixture out of")
    left: str | None = Field(
        default=None, description="Touchstone file of the half on port 1; its port 2 meets the unit"
    )
    right: str | None = Field(
        default=None, description="Touchstone file of the half on port 2; its port 1 meets the unit"
    )
    embed: bool = Field(
        default=False, description="put `left` and `right` around the unit instead: what it would do in there"
    )
    two_thru: TwoThru | None = Field(default=None, alias="2x-thru")
    dummies: Dummies | None = None
    adapter: Adapter | None = None
    shift: dict[Port, Shift] | None = Field(
        default=None,
        min_length=1,
        description="by port",
        json_schema_extra={"propertyNames": {"pattern": "^[12]$"}},
    )
    renormalise: PortsOhm | None = Field(
        default=None, description="new reference impedance, of both ports or of each"
    )
    waves: Literal["power", "pseudo", "travelling"] | None = Field(
        default=None, description="kind of wave for a complex impedance; power waves where nothing is said"
    )

    @model_validator(mode="after")
    def _one_thing(self) -> DeEmbed:
        given = [way for way in _WAYS if getattr(self, _FIELDS.get(way, way)) is not None]
        kinds = {"halves" if way in ("left", "right") else way for way in given}
        if not given:
            raise trouble(
                "says nothing to take out; name `left` or `right`, `2x-thru`, `dummies`, `adapter`, `shift` "
                "or `renormalise`"
            )
        if len(kinds) > 1:
            raise trouble(
                f"does {len(kinds)} things ({', '.join(given)}); write a step for each, in the order "
                "in which they stand from the analyzer to the unit",
                given[-1],
            )
        if self.embed and kinds != {"halves"}:
            raise trouble(
                "`embed` puts `left` and `right` around the unit; name at least one of them", "embed"
            )
        if self.waves is not None and self.renormalise is None:
            raise trouble("`waves` belongs to `renormalise`", "waves")
        return self

    def files(self) -> dict[tuple[str, ...], str]:
        """Touchstone files, by their place in the step."""
        found: dict[tuple[str, ...], str | None] = {("left",): self.left, ("right",): self.right}
        if self.two_thru:
            found["2x-thru", "file"] = self.two_thru.file
        if self.dummies:
            for key in ("open", "short", "thru"):
                found["dummies", key] = getattr(self.dummies, key)
        if self.adapter:
            found["adapter", "file"] = self.adapter.file
        return {key: name for key, name in found.items() if name}

    @property
    def text(self) -> str:
        """What is done, in a few words."""
        if self.renormalise is not None:
            one, two = (ohm_text(z) for z in self.renormalise)
            return f"to {one if one == two else f'{one} and {two}'}"
        if self.shift is not None:
            moved = (f"port {p} by {s.delay * 1e12:.4g} ps" for p, s in sorted(self.shift.items()))
            return f"planes moved, {', '.join(moved)}"
        names = list(self.files().values())
        if self.adapter:
            what = names[0] if names else f"between {self.adapter.without} and {self.adapter.behind}"
            return f"adapter {what} out of port {self.adapter.port}'s calibration"
        what = "halves of " if self.two_thru else "dummies " if self.dummies else ""
        return f"{what}{' and '.join(names)} {'around' if self.embed else 'out of'} {self.from_}"

    def needs(self) -> dict[str, tuple[str, str]]:
        """Need a network; an adapter that is to be found also two calibrations."""
        found = {"from": ("network", self.from_)}
        if self.adapter and self.adapter.without and self.adapter.behind:
            found["adapter without"] = ("calibration", self.adapter.without)
            found["adapter behind"] = ("calibration", self.adapter.behind)
        return found


_FIELDS = {"2x-thru": "two_thru"}


def ohm_text(z: complex) -> str:
    """Write an impedance.

    Examples
    --------
    >>> ohm_text(75 + 0j), ohm_text(73 - 42.5j)
    ('75 ohm', '73 - 42.5j ohm')
    """
    if z.imag == 0.0:
        return f"{z.real:g} ohm"
    return f"{z.real:g} {'-' if z.imag < 0 else '+'} {abs(z.imag):g}j ohm"
