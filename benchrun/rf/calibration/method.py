"""What every calibration method offers: the readings it needs, and how it solves them."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import ClassVar, Protocol, TypeAlias

from benchrun.hookup import Hookup
from benchrun.rf.kit import Kit
from benchrun.rf.terms import OnePortTerms, TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["PLAIN", "Defined", "Definitions", "Examiner", "Method", "Options", "Readings", "Terms"]

Terms: TypeAlias = TwelveTerms | OnePortTerms
Readings: TypeAlias = Mapping[str, TwoPort]
"""Raw two-port readings by the text of their hook-up; planes ``(..., f)``. Switch terms, where the analyzer
could read them, stand under :data:`benchrun.rf.calibration.switch_terms.SWITCH_READING`."""
Definitions: TypeAlias = Mapping[str, ComplexArray | TwoPort]
"""What each standard is taken to be, by its name in the kit."""


class Defined(dict[str, "ComplexArray | TwoPort"]):
    """Definitions together with the grid on which they were evaluated.

    Parameters
    ----------
    f_hz
        ``(f,)``; for methods whose unknowns hang together over frequency.
    """

    def __init__(self, f_hz: FloatArray) -> None:
        super().__init__()
        self.f_hz = f_hz


Examiner: TypeAlias = Callable[[TwoPort], TwoPort | ComplexArray]
"""Corrects one raw reading by other people's code."""


@dataclass(frozen=True, slots=True)
class Options:
    """Choices that only some methods know; the others pass them over.

    Parameters
    ----------
    lines
        Names of the line standards (TRL), as in the kit.
    reflect
        Name of the reflecting standard (TRL, LRM); its definition need only be right within 90 degrees.
    beyond_window
        Accept frequencies where no line is between 20 and 160 degrees longer than the thru (TRL).
    """

    lines: tuple[str, ...] = ("line",)
    reflect: str = "short"
    beyond_window: bool = False


PLAIN = Options()
"""What holds where nothing is said."""


class Method(Protocol):
    """One calibration method."""

    name: ClassVar[str]
    """As written in a sequence."""
    standards: ClassVar[tuple[str, ...]]
    """Names of the standards it takes from the kit, with plain options."""
    two_port: ClassVar[bool]
    """Whether the calibration serves two ports."""
    without_switch_terms: ClassVar[str]
    """What the method cannot do where nobody has read the switch terms; empty where it needs none."""

    def takes(self, options: Options = PLAIN) -> tuple[str, ...]:
        """Names of the standards it takes from the kit, with these options."""
        ...

    def required(
        self, ports: tuple[int, ...], isolation: bool = False, options: Options = PLAIN
    ) -> tuple[Hookup, ...]:
        """Name the hook-ups to read, in the order that spares hands the most."""
        ...

    def solve(
        self,
        ports: tuple[int, ...],
        definitions: Definitions,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> Terms:
        """Error terms from the readings.

        Raises
        ------
        InvalidMeasurement
            If the readings do not determine the terms.
        """
        ...

    def examiner(
        self,
        f_hz: FloatArray,
        ports: tuple[int, ...],
        kit: Kit,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> Examiner:
        """The same calibration by scikit-rf, ready to correct raw readings for comparison."""
        ...
