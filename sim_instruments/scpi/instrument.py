"""Base of every simulated instrument: common commands, status subsystem, pending operations."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial

from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.line import Line
from sim_instruments.scpi.locks import Locks
from sim_instruments.scpi.message import Unit
from sim_instruments.scpi.parameters import whole
from sim_instruments.scpi.status import Register, Status
from sim_instruments.scpi.tree import Command, Tree
from sim_instruments.world import World

__all__ = ["Instrument"]


class Instrument:
    """An instrument that takes program messages and gives response messages.

    Clients talk to it through a :class:`~sim_instruments.scpi.line.Line` each.

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
        self.locks = Locks()
        self.line_closed = False
        self._tell_complete = False
        self._answered = False
        self._common: dict[str, Command] = {
            "*IDN": Command(get=lambda _: ",".join(self.identity), last=True),
            "*RST": Command(set=lambda _: self._reset()),
            "*CLS": Command(set=lambda _: self._clear_status()),
            "*OPC": Command(set=lambda _: self._note_complete(), get=lambda _: "1", get_waits=True),
            "*WAI": Command(set=lambda _: None, set_waits=True),
            "*TRG": Command(set=lambda _: self.fire()),
            "*TST": Command(get=lambda _: "0"),
            "*ESR": Command(get=lambda _: self._esr()),
            "*ESE": self._byte("ese"),
            "*SRE": self._byte("sre"),
            "*STB": Command(get=lambda _: self._stb()),
        }
        self._add_standard()

    # -- what an instrument kind overrides ---------------------------------------------------------------

    def reset(self) -> None:
        """``*RST``: settings and pending operations."""

    def ready_s(self, readings: bool) -> float | None:
        """When pending operations are complete, in simulated time.

        Parameters
        ----------
        readings
            When there are readings, rather.

        Returns
        -------
        float or None
            None: they are; infinite: not before a trigger comes.
        """
        return None

    def refresh(self) -> None:
        """Bring conditions up to the world's time; called before each unit."""
        if self._tell_complete and self.ready_s(False) is None:
            self._tell_complete = False
            self.status.esr |= 1

    def asked(self) -> None:
        """Somebody polls: asking takes time too, so that a poll always comes to an end."""

    def fire(self) -> None:
        """``*TRG`` and group execute trigger."""
        raise ScpiError(-211)

    # -- the ways in -------------------------------------------------------------------------------------

    def line(self, sink: Callable[[bytes], None] | None = None) -> Line:
        """A line for one client; see :class:`~sim_instruments.scpi.line.Line`."""
        return Line(self, sink)

    def group_trigger(self) -> None:
        """A trigger that comes over the interface instead of in a message."""
        with self.world.lock:
            self.refresh()
            try:
                self.fire()
            except ScpiError as error:
                self.status.report(error)

    def status_byte(self, message_available: bool) -> int:
        """As a serial poll gives it."""
        with self.world.lock:
            self.refresh()
            return self.status.byte(message_available)

    def forget_complete(self) -> None:
        """An ``*OPC`` that still waits is dropped (device clear, ``*CLS``, ``*RST``)."""
        self._tell_complete = False

    # -- carrying out ------------------------------------------------------------------------------------

    def find(self, unit: Unit, path: tuple[str, ...]) -> Command:
        """The command that a unit means.

        Raises
        ------
        ScpiError
            -113 or -114.
        """
        if unit.common:
            name = unit.header[0].upper()
            if name not in self._common:
                raise ScpiError(-113, name[:40])
            return self._common[name]
        return self.tree.find(unit.header, () if unit.absolute else path)

    def execute(self, unit: Unit, command: Command, answered: bool) -> str | bytes | None:
        """Carry out one unit.

        Parameters
        ----------
        answered
            An answer to an earlier unit waits already.

        Raises
        ------
        ScpiError
        """
        header = ":".join(unit.header)[:60]
        self._answered = answered
        if unit.query:
            if command.get is None:
                raise ScpiError(-113, header + "?")
            self._count(header, unit, command.asks_least, command.asks_most)
            return command.get(unit.parameters)
        if command.set is None:
            raise ScpiError(-113, header)
        self._count(header, unit, command.least, command.most)
        command.set(unit.parameters)
        return None

    @staticmethod
    def _count(header: str, unit: Unit, least: int, most: int) -> None:
        if len(unit.parameters) < least:
            raise ScpiError(-109, header)
        if len(unit.parameters) > most:
            # A list that fits this command but not this instrument is too much; a parameter too many is not.
            raise ScpiError(-223 if most > 2 else -108, unit.parameters[most][:40])

    # -- standard commands -------------------------------------------------------------------------------

    def _reset(self) -> None:
        self.reset()
        self.forget_complete()

    def _clear_status(self) -> None:
        self.status.clear()
        self.forget_complete()

    def _note_complete(self) -> None:
        self._tell_complete = True
        self.refresh()

    def _esr(self) -> str:
        self.asked()
        self.refresh()
        return str(self.status.take_esr())

    def _stb(self) -> str:
        self.asked()
        self.refresh()
        return str(self.status.byte(self._answered))

    def _byte(self, name: str) -> Command:
        def put(parameters: tuple[str, ...]) -> None:
            value = whole(parameters[0], 0, 255)
            setattr(self.status, name, value & ~64 if name == "sre" else value)  # bit 6 is not kept (11.3.2)

        return Command(put, lambda _: str(getattr(self.status, name)), 1, 1)

    def _add_standard(self) -> None:
        status, add = self.status, self.tree.add
        for node, text in (("", True), (":CODE", False)):
            add(f"SYSTem:ERRor{node}[:NEXT]", Command(get=partial(self._next_error, text)))
            add(f"SYSTem:ERRor{node}:ALL", Command(get=partial(self._all_errors, text)))
        add("SYSTem:ERRor:COUNt", Command(get=lambda _: str(len(status.errors))))
        add("SYSTem:VERSion", Command(get=lambda _: "1999.0"))
        add("STATus:PRESet", Command(set=lambda _: self._preset_status()))
        for name, register in (("OPERation", status.operation), ("QUEStionable", status.questionable)):
            self._add_register(name, register)

    def _add_register(self, name: str, register: Register) -> None:
        def field(attribute: str) -> Command:
            def put(parameters: tuple[str, ...]) -> None:
                setattr(register, attribute, whole(parameters[0], 0, 65535) & 0x7FFF)

            return Command(put, lambda _: str(getattr(register, attribute)), 1, 1)

        def event(_: tuple[str, ...]) -> str:
            self.asked()
            self.refresh()
            return str(register.take_event())

        def condition(_: tuple[str, ...]) -> str:
            self.asked()
            self.refresh()
            return str(register.condition)

        self.tree.add(f"STATus:{name}[:EVENt]", Command(get=event))
        self.tree.add(f"STATus:{name}:CONDition", Command(get=condition))
        self.tree.add(f"STATus:{name}:ENABle", field("enable"))
        self.tree.add(f"STATus:{name}:PTRansition", field("ptransition"))
        self.tree.add(f"STATus:{name}:NTRansition", field("ntransition"))

    def _next_error(self, text: bool, _: tuple[str, ...]) -> str:
        entry = self.status.next_error()
        return entry if text else entry.partition(",")[0]

    def _all_errors(self, text: bool, _: tuple[str, ...]) -> str:
        return ",".join(self._next_error(text, ()) for _ in range(max(len(self.status.errors), 1)))

    def _preset_status(self) -> None:
        self.status.operation.preset()
        self.status.questionable.preset()
