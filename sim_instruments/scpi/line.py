"""One client's exchange of messages with an instrument (IEEE 488.2, chapter 6).

Program messages come in, response messages go out; an operation that is still pending holds up what must
wait for it. Time never sleeps: whoever waits for the answer lets the world go on.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Generator
from typing import TYPE_CHECKING

from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.message import Unit, message_end, units

if TYPE_CHECKING:
    from sim_instruments.scpi.instrument import Instrument
    from sim_instruments.scpi.tree import Command

__all__ = ["Line"]


class Line:
    """Input buffer, parser and output queue.

    Parameters
    ----------
    instrument
        What answers.
    sink
        Takes each response as soon as it is complete, as on a stream, where nobody can tell what has been
        read; None keeps it in the output queue.
    """

    input_bytes = 4_000_000
    """What the input buffer holds."""
    output_bytes = 64_000_000
    """What the output queue holds."""

    def __init__(self, instrument: Instrument, sink: Callable[[bytes], None] | None = None) -> None:
        self.instrument = instrument
        self._sink = sink
        self._input = bytearray()
        self._output, self._taken = b"", 0
        self._skipping = False
        self._job: Generator[float, None, None] | None = None
        self._until = 0.0
        self._end = False

    @property
    def has_output(self) -> bool:
        """Whether a response, or the rest of one, waits to be read."""
        return self._taken < len(self._output)

    @property
    def held(self) -> bool:
        """Whether a message waits for a pending operation."""
        return self._job is not None

    @property
    def empty(self) -> bool:
        """Whether nothing came in that was not carried out."""
        return not self._input and self._job is None

    def receive(self, data: bytes, end: bool = False) -> None:
        """Take bytes of program messages.

        Parameters
        ----------
        data
            Whole messages or parts of them; LF ends one, except within a data block.
        end
            END came with the last byte: the message ends there, LF or not.
        """
        with self.instrument.world.lock:
            if self._skipping:
                data = self._skip(data, end)
            if len(self._input) + len(data) > self.input_bytes:
                self._input.clear()
                self._skipping = True
                self.instrument.status.report(ScpiError(-363))
                data = self._skip(data, end)
            self._input += data
            self._end = end
            self._run()

    def _skip(self, data: bytes, end: bool) -> bytes:
        """Drop the rest of a message that was too long."""
        rest = data.partition(b"\n")
        self._skipping = not rest[1] and not end
        return b"" if not rest[1] or len(rest[2]) > self.input_bytes else rest[2]

    def take(self, count: int, until: int | None = None) -> tuple[bytes, bool]:
        """Give up to ``count`` bytes of the response; the flag says that it ends there.

        Parameters
        ----------
        until
            Stop after this byte, if any.
        """
        with self.instrument.world.lock:
            start = self._taken
            stop = min(start + count, len(self._output))
            if until is not None:
                found = self._output.find(bytes([until]), start, stop)
                stop = found + 1 if found >= 0 else stop
            data = self._output[start:stop]
            self._taken = stop
            ended = stop == len(self._output)
            if ended:
                self._output, self._taken = b"", 0
            return data, ended

    def proceed(self, limit_s: float = math.inf) -> None:
        """Let the world go on until the message that is held up has its answer.

        Parameters
        ----------
        limit_s
            Simulated seconds that the client waits at most; they pass if no answer comes in them.
        """
        world = self.instrument.world
        with world.lock:
            deadline = world.time_s + limit_s
            self._run()
            while self._job is not None and not self.has_output:
                if self._until > deadline or math.isinf(self._until):
                    break
                world.advance(self._until - world.time_s)
                self._run()
            if not self.has_output and math.isfinite(deadline):
                world.advance(deadline - world.time_s)
                self._run()

    def status_byte(self) -> int:
        """As a serial poll on this line gives it."""
        with self.instrument.world.lock:
            self.instrument.asked()
            self._run()
            return self.instrument.status_byte(self.has_output)

    def unasked(self) -> None:
        """Note that somebody reads, and there is nothing to say (6.3.2.2)."""
        if self._job is None and not self.has_output:
            self.instrument.status.report(ScpiError(-420))

    def interrupted(self) -> None:
        """Note that a new message came before the response was read: it is lost (6.3.2.3)."""
        self._output, self._taken = b"", 0
        self.instrument.status.report(ScpiError(-410))

    def clear(self) -> None:
        """Device clear: input, output and what is held up are forgotten, settings kept (chapter 5)."""
        with self.instrument.world.lock:
            self._input.clear()
            self._output, self._taken, self._skipping, self._job = b"", 0, False, None
            self.instrument.forget_complete()

    # -- carrying out ------------------------------------------------------------------------------------

    def _run(self) -> None:
        while True:
            if self._job is None:
                stop = message_end(self._input, self._end)
                if stop is None:
                    return
                message = bytes(self._input[:stop]).rstrip(b"\r")
                del self._input[: stop + 1]
                if not message.strip():
                    continue
                self._job = self._carry_out(message.decode("latin-1"))
            job = self._job
            for self._until in job:
                return
            if self._job is job:  # otherwise a command has cleared this line
                self._job = None

    def _carry_out(self, message: str) -> Generator[float, None, None]:
        """One message; yields the simulated time for which it waits."""
        instrument = self.instrument
        if self.has_output:
            self.interrupted()
        path: tuple[str, ...] = ()
        answers: list[bytes] = []
        room, arbitrary = self.output_bytes, False
        for unit in units(message):
            try:
                if isinstance(unit, ScpiError):
                    raise unit
                command = instrument.find(unit, path)
                if not unit.common:
                    path = (*(() if unit.absolute else path), *unit.header)[:-1]
                if unit.query and arbitrary:
                    raise ScpiError(-440, ":".join(unit.header))
                yield from self._wait(unit, command)
                answer = instrument.execute(unit, command, bool(answers))
            except ScpiError as error:
                instrument.status.report(error)
                continue
            except Exception as error:  # a fault of the model must show, not vanish in a door
                instrument.status.report(ScpiError(-300, f"{type(error).__name__} {error}"))
                continue
            if answer is not None and room >= 0:
                arbitrary |= command.last
                answers.append(answer.encode("ascii", "replace") if isinstance(answer, str) else answer)
                room -= len(answers[-1]) + 1
                if room < 0:  # input and output both full: the answers give way (6.3.1.7)
                    answers.clear()
                    instrument.status.report(ScpiError(-430))
        if answers:
            self._say(b";".join(answers) + b"\n")

    def _say(self, response: bytes) -> None:
        if self._sink is None:
            self._output, self._taken = response, 0
        else:
            self._sink(response)

    def _wait(self, unit: Unit, command: Command) -> Generator[float, None, None]:
        instrument = self.instrument
        waits = command.measures or command.get_waits if unit.query else command.set_waits
        instrument.refresh()
        while waits and (until := instrument.ready_s(unit.query and command.measures)) is not None:
            if unit.query and command.measures and math.isinf(until):
                raise ScpiError(-214, "readings are asked for and nothing will trigger them")
            yield until
            instrument.refresh()
