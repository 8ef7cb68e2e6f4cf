"""Base of every simulated instrument: message exchange, common commands, status subsystem."""

from __future__ import annotations

from collections.abc import Callable

from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.message import Unit, number, units
from sim_instruments.scpi.status import Register, Status
from sim_instruments.scpi.tree import Command, Tree
from sim_instruments.world import World

__all__ = ["Instrument"]

_INPUT_BYTES = 4_000_000


class Instrument:
    """An instrument that takes program messages and gives response messages.

    Parameters
    ----------
    world
        Where it stands.
    identity
        Four fields of ``*IDN?``.
    """

    def __init__(self, world: World, identity: tuple[str, str, str, str]) -> None:
        self.world = world
        self.identity = identity
        self.status = Status()
        self.tree = Tree()
        self.line_closed = False
        self._input = bytearray()
        self._output = bytearray()
        self._common: dict[str, Command] = {
            "*IDN": Command(get=lambda _: ",".join(self.identity)),
            "*RST": Command(set=lambda _: self.reset()),
            "*CLS": Command(set=lambda _: self.status.clear()),
            "*OPC": Command(set=lambda _: self._note_complete(), get=lambda _: self._when_complete()),
            "*WAI": Command(set=lambda _: self.finish()),
            "*TST": Command(get=lambda _: "0"),
            "*ESR": Command(get=lambda _: str(self.status.take_esr())),
            "*ESE": self._byte("ese"),
            "*SRE": self._byte("sre"),
            "*STB": Command(get=lambda _: str(self.status.byte(bool(self._output)))),
        }
        self._add_standard()

    # -- what an instrument kind overrides ---------------------------------------------------------------

    def reset(self) -> None:
        """``*RST``."""

    def finish(self) -> None:
        """Let the world go on until pending operations are complete."""

    def refresh(self) -> None:
        """Bring conditions up to the world's time; called before each unit."""

    # -- the line ----------------------------------------------------------------------------------------

    def receive(self, data: bytes) -> None:
        """Take bytes of program messages; each LF ends one."""
        with self.world.lock:
            if len(self._input) + len(data) > _INPUT_BYTES:
                self._input.clear()
                self.status.report(ScpiError(-363))
                return
            self._input += data
            while (end := self._input.find(b"\n")) >= 0:
                message = bytes(self._input[:end]).rstrip(b"\r")
                del self._input[: end + 1]
                self._carry_out(message)

    def take(self, count: int, until: int | None = None) -> tuple[bytes, bool]:
        """Give up to ``count`` bytes of the response; the flag says that it ends there.

        Parameters
        ----------
        until
            Stop after this byte, if any.
        """
        with self.world.lock:
            size = min(count, len(self._output))
            if until is not None:
                found = self._output.find(bytes([until]), 0, size)
                size = found + 1 if found >= 0 else size
            data = bytes(self._output[:size])
            del self._output[:size]
            return data, not self._output

    def unasked(self) -> None:
        """Note that somebody reads with nothing to say."""
        self.status.report(ScpiError(-420))

    @property
    def has_output(self) -> bool:
        """Whether a response waits."""
        return bool(self._output)

    def clear(self) -> None:
        """Device clear: input and output forgotten, settings kept."""
        with self.world.lock:
            self._input.clear()
            self._output.clear()

    def status_byte(self) -> int:
        """As a serial poll gives it."""
        with self.world.lock:
            self.refresh()
            return self.status.byte(bool(self._output))

    # -- carrying out ------------------------------------------------------------------------------------

    def _carry_out(self, message: bytes) -> None:
        if self._output:  # IEEE 488.2, 6.3.2.3: a new message before the old answer was read
            self._output.clear()
            self.status.report(ScpiError(-410))
        try:
            text = message.decode("ascii")
        except UnicodeDecodeError:
            self.status.report(ScpiError(-101))
            return
        path: tuple[str, ...] = ()
        answers: list[bytes] = []
        for unit in units(text):
            if isinstance(unit, ScpiError):
                self.status.report(unit)
                continue
            self.refresh()
            try:
                command = self._find(unit, path)
                if not unit.common:
                    path = () if unit.absolute else path
                    path = (*path, *unit.header)[:-1]
                answer = self._execute(unit, command)
            except ScpiError as error:
                self.status.report(error)
                continue
            except Exception as error:  # a fault of the model must show, not vanish in the VISA layer
                self.status.report(ScpiError(-300, f"{type(error).__name__} {error}"))
                continue
            if answer is not None:
                answers.append(answer.encode("ascii", "replace") if isinstance(answer, str) else answer)
        if answers:
            self._output += b";".join(answers) + b"\n"

    def _find(self, unit: Unit, path: tuple[str, ...]) -> Command:
        if unit.common:
            name = unit.header[0].upper()
            if name not in self._common:
                raise ScpiError(-113, name)
            return self._common[name]
        return self.tree.find(unit.header, () if unit.absolute else path)

    def _execute(self, unit: Unit, command: Command) -> str | bytes | None:
        if unit.query:
            if command.get is None:
                raise ScpiError(-113, ":".join(unit.header) + "?")
            return command.get(unit.parameters)
        if command.set is None:
            raise ScpiError(-113, ":".join(unit.header))
        if len(unit.parameters) < command.least:
            raise ScpiError(-109, ":".join(unit.header))
        if len(unit.parameters) > command.most:
            raise ScpiError(-108, unit.parameters[command.most][:40])
        command.set(unit.parameters)
        return None

    # -- standard commands -------------------------------------------------------------------------------

    def _note_complete(self) -> None:
        self.finish()
        self.status.esr |= 1

    def _when_complete(self) -> str:
        self.finish()
        return "1"

    def _byte(self, name: str) -> Command:
        def put(parameters: tuple[str, ...]) -> None:
            setattr(self.status, name, int(number(parameters[0], 0, 255)))

        return Command(put, lambda _: str(getattr(self.status, name)), 1, 1)

    def _add_standard(self) -> None:
        status = self.status
        self.tree.add("SYSTem:ERRor[:NEXT]", Command(get=lambda _: status.next_error()))
        self.tree.add("SYSTem:ERRor:COUNt", Command(get=lambda _: str(len(status.errors))))
        self.tree.add("SYSTem:ERRor:ALL", Command(get=lambda _: self._all_errors()))
        self.tree.add("SYSTem:VERSion", Command(get=lambda _: "1999.0"))
        self.tree.add("STATus:PRESet", Command(set=lambda _: self._preset_status()))
        for name, register in (("OPERation", status.operation), ("QUEStionable", status.questionable)):
            self._add_register(name, register)

    def _add_register(self, name: str, register: Register) -> None:
        def field(attribute: str) -> Command:
            def put(parameters: tuple[str, ...]) -> None:
                setattr(register, attribute, int(number(parameters[0], 0, 65535)) & 0x7FFF)

            return Command(put, lambda _: str(getattr(register, attribute)), 1, 1)

        take: Callable[[tuple[str, ...]], str] = lambda _: str(register.take_event())  # noqa: E731
        self.tree.add(f"STATus:{name}[:EVENt]", Command(get=take))
        self.tree.add(f"STATus:{name}:CONDition", Command(get=lambda _: str(register.condition)))
        self.tree.add(f"STATus:{name}:ENABle", field("enable"))
        self.tree.add(f"STATus:{name}:PTRansition", field("ptransition"))
        self.tree.add(f"STATus:{name}:NTRansition", field("ntransition"))

    def _all_errors(self) -> str:
        found = [self.status.next_error() for _ in range(max(len(self.status.errors), 1))]
        return ",".join(found)

    def _preset_status(self) -> None:
        self.status.operation.preset()
        self.status.questionable.preset()
