"""What a person sees while a run goes: one line for each thing that happens, then the limits."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any, Literal, TextIO

from rich.console import Console
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from benchrun.engine import events
from benchrun.evaluate.judgement import JudgedFigure
from benchrun.report.words import amount, difference, duration, limit, outside

if TYPE_CHECKING:
    from benchrun.engine.run import Outcome

__all__ = ["Screen"]

_COLUMNS: tuple[tuple[str, Literal["left", "right"]], ...] = (
    ("limit", "left"),
    ("measured", "right"),
    ("allowed", "left"),
    ("margin", "right"),
    ("U, k=2", "right"),
    ("where", "right"),
    ("conclusion", "left"),
)


class Screen:
    """Shows events as they come.

    Weight and inversion carry the meaning, not colour: it must read on any terminal and on paper.

    Parameters
    ----------
    stream
        Where to.
    quiet
        Only what went wrong.
    """

    def __init__(self, stream: TextIO, quiet: bool = False) -> None:
        self._console = Console(file=stream, highlight=False, soft_wrap=False)
        if not self._console.is_terminal:
            self._console = Console(file=stream, highlight=False, width=120)
        self._quiet = quiet
        self._figures: list[JudgedFigure] = []
        self._said: set[str] = set()
        self._shown: dict[type[events.Event], Callable[[Any], None]] = {
            events.RunStarted: self._started,
            events.Cautioned: self._cautioned,
            events.InstrumentFound: lambda e: self._line(f"{e.role} at {e.resource}: {e.identity}"),
            events.StepStarted: self._step,
            events.Prompted: lambda e: self._timed(e, f"connect {e.hookup}"),
            events.ReadingTaken: lambda e: self._timed(e, f"read {e.points} points, {e.hookup}"),
            events.Noted: lambda e: self._timed(e, e.text),
            events.FigureJudged: lambda e: self._figures.append(e.figure),
            events.StepEnded: self._step_ended,
            events.MadeSafe: self._safe,
        }

    def show(self, event: events.Event) -> None:
        """Show one event."""
        if not self._quiet and (show := self._shown.get(type(event))):
            show(event)

    def finish(self, outcome: Outcome) -> None:
        """The conclusion, and where the record is; what went wrong is said in quiet mode too."""
        bad = [f for f in outcome.figures if f.conclusion != "pass"]
        self._line("")
        if not self._quiet:
            head = Text(f"{outcome.unit}: ")
            head.append(
                outcome.conclusion.value,
                style="bold" if outcome.conclusion.exit_code == 0 else "bold reverse",
            )
            if not bad and outcome.figures and not outcome.reason:
                head.append(f", all {len(outcome.figures)} limits hold")
            self._console.print(head)
        for figure in bad:
            self._line(f"  {figure.conclusion}: {outside(figure)}")
        for text in (outcome.reason, outcome.advice):
            if text:
                self._loud(f"{text}")
        for text in outcome.left_on:
            self._loud(f"STILL ON: {text}")
        if outcome.trouble:
            self._loud(outcome.trouble)
        elif outcome.record:
            self._line(f"record {outcome.record}")

    def _line(self, text: str) -> None:
        if not self._quiet:
            self._console.print(Text(text), soft_wrap=True)

    def _loud(self, text: str) -> None:
        self._console.print(Text(text, style="bold"), soft_wrap=True)

    def _timed(self, event: events.Event, text: str) -> None:
        self._line(f"  {duration(event.at_s):>12}  {text}")

    def _started(self, event: events.RunStarted) -> None:
        self._figures.clear()
        self._console.print(Text(f"{event.title} ({event.sequence})", style="bold"))
        self._line(f"unit {event.unit}, {event.part}")
        self._line(f"bench {event.bench}; operator {event.operator}")
        if event.simulated:
            self._line(f"rehearsal: simulated instruments, seed {event.seed}")

    def _cautioned(self, event: events.Cautioned) -> None:
        if event.text not in self._said:  # once for a series of units
            self._said.add(event.text)
            self._line(f"caution: {event.text}")

    def _step(self, event: events.StepStarted) -> None:
        self._line("")
        self._console.print(
            Text.assemble((f"{event.number}. {event.kind} {event.step}", "bold"), f": {event.what}")
        )

    def _step_ended(self, event: events.StepEnded) -> None:
        if not self._figures:
            return
        table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="underline")
        for name, justify in _COLUMNS:
            table.add_column(name, justify=justify, overflow="fold")
        for f in self._figures:
            table.add_row(
                f.name,
                amount(f.value, f.unit),
                limit(f),
                difference(f.margin, f.unit),
                difference(f.uncertainty, f.unit),
                amount(f.at_hz, "Hz"),
                Text(f.conclusion, style="" if f.conclusion == "pass" else "bold reverse"),
            )
        self._console.print(Padding(table, (0, 0, 0, 2)))
        self._figures.clear()

    def _safe(self, event: events.MadeSafe) -> None:
        self._line("")
        if not event.left_on:
            self._timed(event, "sources off")
