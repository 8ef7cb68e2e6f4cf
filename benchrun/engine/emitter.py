"""Telling what happens: to whoever listens, and into the journals that disk and record keep."""

from __future__ import annotations

import contextlib
import dataclasses
import json
from collections.abc import Iterator

from benchrun.clock import Clock
from benchrun.engine.events import Event, Sink
from benchrun.engine.journal import Journal
from benchrun.evaluate.judgement import JudgedFigure

__all__ = ["Emitter"]


def _plain(figure: JudgedFigure) -> dict[str, object]:
    """The only objects that events hold."""
    return {f.name: getattr(figure, f.name) for f in dataclasses.fields(figure)}


class Emitter:
    """Sends events, with their time, to a sink and keeps them.

    A screen that fails (a closed pipe, a full disk, a fault of its own) loses its events, never the run.

    Parameters
    ----------
    sink
        Who listens.
    clock
        Bench time.
    journal
        The journal on disk, if there is one.
    """

    def __init__(self, sink: Sink, clock: Clock, journal: Journal | None = None) -> None:
        self._sink: Sink | None = sink
        self._clock = clock
        self._journal = journal
        self.start_s = clock.seconds()
        self._lines: list[str] = []
        self._muted = False

    def seconds(self) -> float:
        """Bench seconds since the run began."""
        return round(self._clock.seconds() - self.start_s, 6)

    def recall(self, lines: list[str]) -> None:
        """Begin with what an earlier process told: lines of its journal."""
        self._lines = [*lines]

    @property
    def silent(self) -> bool:
        """Whether nothing is told now."""
        return self._muted

    @contextlib.contextmanager
    def muted(self, wanted: bool = True) -> Iterator[None]:
        """Within it nothing is told or kept: what happens has happened before."""
        before, self._muted = self._muted, self._muted or wanted
        try:
            yield
        finally:
            self._muted = before

    def __call__(self, event: Event) -> None:
        """Tell."""
        if self._muted:
            return
        event = dataclasses.replace(event, at_s=self.seconds())
        line = json.dumps(event.as_json(), ensure_ascii=False, default=_plain)
        self._lines.append(line)
        if self._journal is not None:
            self._journal.line("event", text=line)
        if self._sink is not None:
            try:
                self._sink(event)
            except (Exception, SystemExit):  # rich leaves the program when its pipe is shut
                self._sink = None

    def as_json_lines(self) -> bytes:
        """The journal as the record keeps it: one JSON object a line."""
        return "".join(f"{line}\n" for line in self._lines).encode()
