"""The night file: which sequences run by themselves, on which benches, how often, and when to give up."""

from __future__ import annotations

import re
from typing import Annotated, Literal

from pydantic import Field, model_validator

from benchrun.sequence.fields import Duration, FileModel, Listed, Name, trouble

__all__ = ["Limits", "Night", "NightJob", "Population", "Rehearsed"]

_PLACE = re.compile(r"\{(?::0?[0-9]{0,2}d)?\}")
_MOST = 100_000


class Population(FileModel):
    """Serial numbers in a row, for example of simulated units: ``HF-{:04d}`` from 1 to 100."""

    serial: str = Field(min_length=1, max_length=80)
    from_: int = Field(alias="from", ge=0)
    to: int = Field(ge=0)

    @model_validator(mode="after")
    def _counts(self) -> Population:
        if len(_PLACE.findall(self.serial)) != 1 or self.serial.count("{") != 1:
            raise trouble(
                f"serial {self.serial!r} needs one place for the number, as in HF-{{:04d}}", "serial"
            )
        if not 0 <= self.to - self.from_ < _MOST:
            raise trouble(f"from {self.from_} to {self.to} are not 1 to {_MOST} units", "to")
        return self

    @property
    def serials(self) -> tuple[str, ...]:
        """All of them."""
        return tuple(self.serial.format(n) for n in range(self.from_, self.to + 1))


class Rehearsed(FileModel):
    """On the simulated bench: each repeat has the next seed."""

    seed: int = Field(default=1, ge=0, lt=2**62)


class NightJob(FileModel):
    """One sequence on one bench."""

    job: Name
    sequence: str = Field(min_length=1, max_length=400)
    bench: str | None = Field(default=None, min_length=1, max_length=400)
    units: Annotated[tuple[str, ...], Listed] = ()
    population: Population | None = None
    repeats: int = Field(default=1, ge=1, le=_MOST)
    rehearsal: Rehearsed | None = None

    @model_validator(mode="after")
    def _complete(self) -> NightJob:
        if self.bench is None and self.rehearsal is None:
            raise trouble("a job at real instruments needs a bench", "job")
        if self.rehearsal is None and not self.serials:
            raise trouble("a job at real instruments needs units", "job")
        if self.units and self.population is not None:
            raise trouble("give units or a population, not both", "population")
        return self

    @property
    def serials(self) -> tuple[str, ...]:
        """Serial numbers of one repeat; none: the first unit that the simulated bench has."""
        return self.population.serials if self.population is not None else self.units


class Limits(FileModel):
    """When to give up."""

    time: Duration | None = None
    run: Duration | None = None
    failures_in_a_row: int | None = Field(default=None, alias="failures in a row", ge=1)


class Night(FileModel):
    """What runs by itself."""

    night: Name
    edition: Literal[1]
    title: str = Field(min_length=1, max_length=120)
    workers: int = Field(default=2, ge=1, le=64)
    limits: Limits = Limits()
    jobs: Annotated[tuple[NightJob, ...], Listed] = Field(min_length=1, max_length=1000)

    @model_validator(mode="after")
    def _names_differ(self) -> Night:
        names = [job.job for job in self.jobs]
        if twice := next((name for name in names if names.count(name) > 1), None):
            raise trouble(f"two jobs are called {twice!r}", "jobs")
        return self
