"""The bench file: which instruments stand where, and how good they are declared to be."""

from __future__ import annotations

import math
from typing import Annotated, Any, Literal, TypeAlias

from pydantic import BeforeValidator, Field, model_validator

from benchrun.sequence.fields import (
    FileModel,
    Frequency,
    FrequencyRange,
    Listed,
    Name,
    Power,
    PowerRange,
    trouble,
)
from benchrun.sequence.models import Withstands
from benchrun.uncertainty.level import LEVEL_TERMS, LevelTerms
from benchrun.uncertainty.residual import DECIBEL_LOSS, DECIBEL_RIPPLE, ResidualTerms
from benchrun.uncertainty.sources import GROUPS, Sources

__all__ = ["Bench", "Instrument", "Port", "Range", "Role", "Uncertainty"]


Role: TypeAlias = Literal["analyzer", "generator", "spectrum analyzer", "supply"]
"""What an instrument does on a bench; ``analyzer`` is the network analyzer."""


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
    ports: dict[Annotated[int, Field(ge=1, le=9)], Port] = Field(
        default_factory=dict, json_schema_extra={"propertyNames": {"pattern": "^[1-9]$"}}
    )
    range: Range | None = None


def _residual(value: object) -> object:
    if isinstance(value, dict):
        ResidualTerms.from_mapping({str(k): str(v) for k, v in value.items()})  # refuses what it cannot read
    return value


def _level(value: object) -> object:
    if isinstance(value, dict):
        LevelTerms.from_mapping({str(k): str(v) for k, v in value.items()})  # refuses what it cannot read
    return value


_KNOWN = DECIBEL_LOSS + DECIBEL_RIPPLE


def _sources(value: object) -> object:
    if isinstance(value, dict):
        for group, entries in value.items():
            if not isinstance(entries, dict):
                raise ValueError(f"{group}: {entries!r} is no list of sizes; it takes {_sizes(group)}")
        Sources.from_mapping(
            {str(g): {str(k): str(v) for k, v in entries.items()} for g, entries in value.items()}
        )  # refuses what it cannot read
    return value


def _sizes(group: object) -> str:
    return ", ".join(GROUPS.get(str(group), GROUPS))


_SOURCE_SCHEMA: dict[str, Any] = {
    "type": "object",
    "properties": {
        group: {"type": "object", "propertyNames": {"enum": [*keys, "distribution"]}}
        for group, keys in GROUPS.items()
    },
    "additionalProperties": False,
    "examples": [{"connector": {"repeatability": "68 dB"}}],
}


class Trials(FileModel):
    """How many trials a propagation runs."""

    number: int = Field(
        default=0, ge=0, le=1_000_000, description="always so many; 0: as many as the digits need"
    )
    digits: Literal[1, 2] = Field(default=1, description="of a standard uncertainty that must be stable")


class NoiseAt(FileModel):
    """Conditions of the declared noise; a sweep under others has another noise.

    The floor grows with the root of the bandwidth and falls with the source level in dB, trace noise grows
    with the root of the bandwidth, and averaging lowers both by its root (common practice).
    """

    bandwidth: Frequency = Field(gt=0)
    power: Power

    def factors(self, bandwidth_hz: float, power_dbm: float, averages: int) -> tuple[float, float]:
        """What floor and trace noise are multiplied by in a sweep."""
        trace = math.sqrt(bandwidth_hz / self.bandwidth / averages)
        return trace * 10.0 ** ((self.power - power_dbm) / 20.0), trace


class Uncertainty(FileModel):
    """Declared uncertainty of the bench after calibration."""

    residual: Annotated[dict[str, str], BeforeValidator(_residual)] = Field(
        default_factory=dict,
        json_schema_extra={"propertyNames": {"enum": list(_KNOWN)}, "examples": [{"directivity": "44 dB"}]},
    )

    sources: Annotated[dict[str, dict[str, str]], BeforeValidator(_sources)] = Field(
        default_factory=dict,
        description="what makes readings differ; propagated through calibration and de-embedding, in place "
        "of residual terms",
        json_schema_extra=_SOURCE_SCHEMA,
    )
    trials: Trials = Trials()
    noise_at: NoiseAt | None = Field(
        default=None, alias="noise at", description="conditions under which noise floor and trace noise hold"
    )
    level: Annotated[dict[str, str], BeforeValidator(_level)] = Field(
        default_factory=dict,
        description="standard uncertainties of generator and spectrum analyzer",
        json_schema_extra={"propertyNames": {"enum": list(LEVEL_TERMS)}, "examples": [{"source": "0.2 dB"}]},
    )

    @property
    def level_terms(self) -> LevelTerms:
        """The level terms as numbers."""
        return LevelTerms.from_mapping(self.level)

    @property
    def source_terms(self) -> Sources:
        """The sources as numbers."""
        return Sources.from_mapping(self.sources)

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
    instruments: dict[Role, Instrument] = Field(min_length=1)
    cables: Annotated[tuple[Cable, ...], Listed] = ()
    cautions: Annotated[tuple[str, ...], Listed] = ()
    uncertainty: Uncertainty = Uncertainty()

    @model_validator(mode="after")
    def _own_ports(self) -> Bench:
        taken: dict[int, str] = {}
        for role, instrument in self.instruments.items():
            for port in instrument.ports:
                if (role == "analyzer") != (port in (1, 2)):
                    raise trouble(
                        f"port {port} of the {role} cannot be: the network analyzer has ports 1 and 2, "
                        "all others have higher numbers",
                        "instruments",
                    )
                if port in taken:
                    raise trouble(
                        f"port {port} belongs to the {taken[port]} and to the {role}", "instruments"
                    )
                taken[port] = role
        return self

    @property
    def analyzer(self) -> Instrument:
        """The network analyzer; KeyError where there is none."""
        return self.instruments["analyzer"]

    @property
    def scalar_ports(self) -> tuple[int, int]:
        """Port of the generator and of the spectrum analyzer: the first each declares, else 3 and 4."""

        def port(role: Role, default: int) -> int:
            instrument = self.instruments.get(role)
            return min(instrument.ports) if instrument and instrument.ports else default

        return port("generator", 3), port("spectrum analyzer", 4)
