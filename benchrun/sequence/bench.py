"""The bench file: which instruments stand where, and how good they are declared to be."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import BeforeValidator, Field

from benchrun.sequence.fields import FileModel, FrequencyRange, Listed, Name, PowerRange
from benchrun.sequence.models import Withstands
from benchrun.uncertainty.residual import DECIBEL_LOSS, DECIBEL_RIPPLE, ResidualTerms

__all__ = ["Bench", "Instrument", "Port", "Range", "Uncertainty"]


class Port(FileModel):
    """One port of an instrument, at the end of its cable."""

    connector: str = Field(default="", max_length=40)
    withstands: Withstands


class Range(FileModel):
    """What an instrument can do."""

    frequency: FrequencyRange
    power: PowerRange | None = None
    bandwidth: FrequencyRange | None = None
    points: int = Field(default=100_001, ge=2)


class Expected(FileModel):
    """Who the instrument must say it is; what is left out may be anything."""

    maker: str | None = None
    model: str | None = None
    serial: str | None = None


class Instrument(FileModel):
    """One instrument in its role."""

    resource: str = Field(min_length=3, max_length=200, description="VISA resource name")
    library: str = Field(default="", description='VISA library; empty for the system\'s, "@py" for pyvisa-py')
    dialect: Name
    identity: Expected = Expected()
    ports: dict[Literal[1, 2], Port] = Field(
        default_factory=dict, json_schema_extra={"propertyNames": {"enum": ["1", "2"]}}
    )
    range: Range | None = None


def _residual(value: object) -> object:
    if isinstance(value, dict):
        ResidualTerms.from_mapping({str(k): str(v) for k, v in value.items()})  # refuses what it cannot read
    return value


_KNOWN = DECIBEL_LOSS + DECIBEL_RIPPLE


class Uncertainty(FileModel):
    """Declared uncertainty of the bench after calibration."""

    residual: Annotated[dict[str, str], BeforeValidator(_residual)] = Field(
        default_factory=dict,
        json_schema_extra={"propertyNames": {"enum": list(_KNOWN)}, "examples": [{"directivity": "44 dB"}]},
    )

    @property
    def terms(self) -> ResidualTerms:
        """The terms as numbers."""
        return ResidualTerms.from_mapping(self.residual)


class Cable(FileModel):
    """A cable or adapter that stays in place; named for people and records."""

    name: str = Field(min_length=1, max_length=60)
    port: Literal[1, 2]
    note: str = ""


class Bench(FileModel):
    """One bench."""

    bench: Name
    edition: Literal[1]
    title: str = Field(min_length=1, max_length=120)
    rehearsal: str | None = Field(default=None, description="the simulated bench that stands in for this one")
    instruments: dict[Literal["analyzer"], Instrument] = Field(min_length=1)
    cables: Annotated[tuple[Cable, ...], Listed] = ()
    cautions: Annotated[tuple[str, ...], Listed] = ()
    uncertainty: Uncertainty = Uncertainty()

    @property
    def analyzer(self) -> Instrument:
        """The network analyzer."""
        return self.instruments["analyzer"]
