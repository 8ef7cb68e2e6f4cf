"""The kit file: calibration standards as physical parameters with their uncertainty."""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from typing import Annotated, Literal

from pydantic import BeforeValidator, Field, model_validator

from benchrun.rf.kit import Kit, Measured, Offset, Standard
from benchrun.rf.touchstone import TouchstoneData
from benchrun.sequence.fields import (
    Capacitance,
    Delay,
    FileModel,
    FrequencyRange,
    Impedance,
    Inductance,
    LossRate,
    Name,
    trouble,
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
    reflection: float | None = Field(
        default=None, gt=0, le=1, description="of a measured standard: real and imaginary part each, linear"
    )

    def by_parameter(self) -> dict[str, float]:
        """By the names of :class:`benchrun.rf.kit.Standard`."""
        named = {
            "c0_f": self.C0,
            "l0_h": self.L0,
            "delay_s": self.delay,
            "resistance_ohm": self.resistance,
            "series_inductance_h": self.inductance,
            "reflection": self.reflection,
        }
        return {key: value for key, value in named.items() if value is not None}


class StandardFile(FileModel):
    """One standard."""

    kind: Literal["open", "short", "load", "thru", "line"]
    file: str | None = Field(
        default=None, min_length=1, description="Touchstone file of the standard as measured, beside the kit"
    )
    offset: OffsetFile = OffsetFile()
    capacitance: CapacitanceFile | None = None
    inductance: InductanceFile | None = None
    resistance: Impedance = 50.0
    series_inductance: Inductance = Field(default=0.0, alias="series inductance")
    uncertainty: Doubt = Doubt()

    @model_validator(mode="after")
    def _measured_or_model(self) -> StandardFile:
        if self.file is not None:
            model = ("offset", "capacitance", "inductance", "resistance", "series_inductance")
            for key in sorted(self.model_fields_set & set(model)):
                raise trouble(f"is measured (`file`), so `{key}` means nothing", key.replace("_", " "))
        measured, said = self.file is not None, set(self.uncertainty.by_parameter())
        if measured != (said <= {"reflection"}) and said:
            takes = "`reflection`" if measured else "those of its own parameters"
            raise trouble(f"takes as uncertainty {takes}, not {', '.join(sorted(said))}", "uncertainty")
        return self

    def build(self, files: Mapping[str, TouchstoneData]) -> Standard | Measured:
        """As numbers; measured ones from their files by name."""
        if self.file is not None:
            data = files[self.file]
            value = data.two_port if self.kind in ("thru", "line") else data.s[:, 0, 0]
            return Measured(self.kind, data.f_hz, value, data.z0_ohm, self.uncertainty.by_parameter())
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
    connector: str = Field(
        default="",
        pattern=r"^([^,]{1,40}(, (female|male|sexless))?)?$",
        description="family and sex: `type N, female`",
    )
    impedance: Impedance = 50.0
    frequency: FrequencyRange
    due: Annotated[datetime.date, BeforeValidator(_date)] | None = None
    standards: dict[Name, StandardFile] = Field(min_length=1)

    @property
    def family(self) -> str:
        """Connector family, without the sex."""
        return self.connector.split(",")[0].strip()

    def files(self) -> dict[tuple[str, ...], str]:
        """Touchstone files of measured standards, by their place in the kit file."""
        named = {("standards", str(name), "file"): one.file for name, one in self.standards.items()}
        return {place: name for place, name in named.items() if name is not None}

    def build(self, files: Mapping[str, TouchstoneData] | None = None) -> Kit:
        """As numbers.

        Parameters
        ----------
        files
            Of measured standards, by the name that the kit file uses.

        Raises
        ------
        KeyError
            If one is missing.
        """
        standards = {str(name): one.build(files or {}) for name, one in self.standards.items()}
        return Kit(self.kit, standards, *self.frequency, self.impedance, self.serial, self.connector)
