"""The kit file: calibration standards as physical parameters with their uncertainty."""

from __future__ import annotations

import datetime
from typing import Annotated, Literal

from pydantic import BeforeValidator, Field

from benchrun.rf.kit import Kit, Offset, Standard
from benchrun.sequence.fields import (
    Capacitance,
    Delay,
    FileModel,
    FrequencyRange,
    Impedance,
    Inductance,
    LossRate,
    Name,
)

__all__ = ["KitFile"]


class OffsetFile(FileModel):
    """The line in front of a termination."""

    delay: Delay = 0.0
    loss: LossRate = 0.0
    impedance: Impedance = 50.0


class CapacitanceFile(FileModel):
    """Fringing capacitance C0 + C1 f + C2 f^2 + C3 f^3; C1 to C3 in F/Hz, F/Hz^2, F/Hz^3."""

    C0: Capacitance
    C1: float = 0.0
    C2: float = 0.0
    C3: float = 0.0


class InductanceFile(FileModel):
    """Residual inductance L0 + L1 f + L2 f^2 + L3 f^3; L1 to L3 in H/Hz, H/Hz^2, H/Hz^3."""

    L0: Inductance
    L1: float = 0.0
    L2: float = 0.0
    L3: float = 0.0


class Doubt(FileModel):
    """Standard uncertainties of the parameters."""

    C0: Capacitance | None = None
    L0: Inductance | None = None
    delay: Delay | None = None
    resistance: Impedance | None = None
    inductance: Inductance | None = None

    def by_parameter(self) -> dict[str, float]:
        """By the names of :class:`benchrun.rf.kit.Standard`."""
        named = {
            "c0_f": self.C0,
            "l0_h": self.L0,
            "delay_s": self.delay,
            "resistance_ohm": self.resistance,
            "series_inductance_h": self.inductance,
        }
        return {key: value for key, value in named.items() if value is not None}


class StandardFile(FileModel):
    """One standard."""

    kind: Literal["open", "short", "load", "thru", "line"]
    offset: OffsetFile = OffsetFile()
    capacitance: CapacitanceFile | None = None
    inductance: InductanceFile | None = None
    resistance: Impedance = 50.0
    series_inductance: Inductance = Field(default=0.0, alias="series inductance")
    uncertainty: Doubt = Doubt()

    def build(self) -> Standard:
        """As numbers."""
        c, i = self.capacitance, self.inductance
        return Standard(
            self.kind,
            Offset(self.offset.delay, self.offset.loss, self.offset.impedance),
            (c.C0, c.C1, c.C2, c.C3) if c else (0.0, 0.0, 0.0, 0.0),
            (i.L0, i.L1, i.L2, i.L3) if i else (0.0, 0.0, 0.0, 0.0),
            self.resistance,
            self.series_inductance,
            self.uncertainty.by_parameter(),
        )


def _date(value: object) -> object:
    if isinstance(value, str):
        try:
            return datetime.date.fromisoformat(value)
        except ValueError:
            raise ValueError(f"{value!r} is no date; write it as in 2027-06-30") from None
    return value


class KitFile(FileModel):
    """One calibration kit."""

    kit: Name
    edition: Literal[1]
    title: str = Field(min_length=1, max_length=120)
    serial: str = Field(default="", max_length=40)
    connector: str = Field(default="", max_length=40)
    impedance: Impedance = 50.0
    frequency: FrequencyRange
    due: Annotated[datetime.date, BeforeValidator(_date)] | None = None
    standards: dict[Name, StandardFile] = Field(min_length=1)

    def build(self) -> Kit:
        """As numbers."""
        standards = {str(name): standard.build() for name, standard in self.standards.items()}
        return Kit(self.kit, standards, *self.frequency, self.impedance, self.serial, self.connector)
