"""Telling what happens: to whoever listens, and into the journal that the record keeps."""

from __future__ import annotations

import dataclasses
import json

from benchrun.clock import Clock
from benchrun.engine.events import Event, Sink
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
    """

    def __init__(self, sink: Sink, clock: Clock) -> None:
        self._sink: Sink | None = sink
        self._clock = clock
        self.start_s = clock.seconds()
        self.events: list[Event] = []

    def seconds(self) -> float:
        """Bench seconds since the run began."""
        return round(self._clock.seconds() - self.start_s, 6)

    def __call__(self, event: Event) -> None:
        """Tell."""
        event = dataclasses.replace(event, at_s=self.seconds())
        self.events.append(event)
        if self._sink is not None:
            try:
                self._sink(event)
            except (Exception, SystemExit):  # rich leaves the program when its pipe is shut
                self._sink = None

    def as_json_lines(self) -> bytes:
        """The journal: one JSON object a line."""
        return "".join(
            json.dumps(e.as_json(), ensure_ascii=False, default=_plain) + "\n" for e in self.events
        ).encode()
