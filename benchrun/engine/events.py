"""What happens in a run, one small frozen class each; the journal and every view read only these."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, fields
from typing import ClassVar, TypeAlias

from benchrun.evaluate.judgement import JudgedFigure

__all__ = [
    "Cautioned",
    "Event",
    "FigureJudged",
    "InstrumentFound",
    "MadeSafe",
    "Noted",
    "Prompted",
    "ReadingTaken",
    "RecordWritten",
    "RunEnded",
    "RunStarted",
    "Sink",
    "StepEnded",
    "StepStarted",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class Event:
    """Something that happened.

    Parameters
    ----------
    at_s
        Bench seconds since the run began.
    """

    name: ClassVar[str] = ""
    at_s: float = 0.0

    def as_json(self) -> dict[str, object]:
        """The event as plain data, for the journal."""
        # Field by field: asdict() copies deeply, which costs more than the rest of a journal.
        return {"event": self.name, **{f.name: getattr(self, f.name) for f in fields(self)}}


@dataclass(frozen=True, slots=True, kw_only=True)
class RunStarted(Event):
    """The plan is complete and the instruments are about to be asked who they are."""

    name = "run started"
    sequence: str
    title: str
    unit: str
    part: str
    bench: str
    operator: str
    simulated: bool
    seed: int | None
    steps: int
    plan: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Cautioned(Event):
    """A caution that applies to this run."""

    name = "caution"
    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class InstrumentFound(Event):
    """An instrument said who it is."""

    name = "instrument"
    role: str
    resource: str
    identity: str


@dataclass(frozen=True, slots=True, kw_only=True)
class StepStarted(Event):
    """A step begins."""

    name = "step started"
    number: int
    kind: str
    step: str
    what: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Prompted(Event):
    """Hands were asked to connect something."""

    name = "prompt"
    hookup: str


@dataclass(frozen=True, slots=True, kw_only=True)
class ReadingTaken(Event):
    """One sweep was read and kept."""

    name = "reading"
    step: str
    hookup: str
    points: int
    sha256: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Noted(Event):
    """Something worth saying that decides nothing: an agreement, a warning."""

    name = "note"
    text: str
    weight: str = "information"


@dataclass(frozen=True, slots=True, kw_only=True)
class FigureJudged(Event):
    """One limit was judged."""

    name = "figure"
    figure: JudgedFigure


@dataclass(frozen=True, slots=True, kw_only=True)
class StepEnded(Event):
    """A step is finished and its data is safe."""

    name = "step ended"
    number: int
    step: str


@dataclass(frozen=True, slots=True, kw_only=True)
class MadeSafe(Event):
    """Sources are off, or it is said what could not be switched off."""

    name = "safe"
    left_on: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class RunEnded(Event):
    """The run is over, whichever way."""

    name = "run ended"
    conclusion: str
    reason: str = ""
    advice: str = ""
    figures: tuple[JudgedFigure, ...] = field(default=())


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordWritten(Event):
    """The signed record stands."""

    name = "record"
    folder: str
    key: str


Sink: TypeAlias = Callable[[Event], None]
"""Takes one event. It must not raise for anything a screen can do wrong."""
