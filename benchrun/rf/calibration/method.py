"""What every calibration method offers: the readings it needs, and how it solves them."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import ClassVar, Protocol, TypeAlias

from benchrun.hookup import Hookup
from benchrun.rf.kit import Kit
from benchrun.rf.terms import OnePortTerms, TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["Definitions", "Examiner", "Method", "Readings", "Terms"]

Terms: TypeAlias = TwelveTerms | OnePortTerms
Readings: TypeAlias = Mapping[str, TwoPort]
"""Raw two-port readings by the text of their hook-up; planes ``(..., f)``."""
Definitions: TypeAlias = Mapping[str, ComplexArray | TwoPort]
"""What each standard is taken to be, by its name in the kit."""

Examiner: TypeAlias = Callable[[TwoPort], TwoPort | ComplexArray]
"""Corrects one raw reading by other people's code."""


class Method(Protocol):
    """One calibration method."""

    name: ClassVar[str]
    """As written in a sequence."""
    standards: ClassVar[tuple[str, ...]]
    """Names of the standards it takes from the kit."""

    def required(self, ports: tuple[int, ...], isolation: bool = False) -> tuple[Hookup, ...]:
        """Name the hook-ups to read, in the order that spares hands the most."""
        ...

    def solve(
        self, ports: tuple[int, ...], definitions: Definitions, readings: Readings, isolation: bool = False
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
    ) -> Examiner:
        """The same calibration by scikit-rf, ready to correct raw readings for comparison."""
        ...
