"""What all methods share that end in the twelve terms of two ports."""

from __future__ import annotations

from typing import ClassVar

from benchrun.hookup import Hookup
from benchrun.rf.calibration.method import PLAIN, Options
from benchrun.rf.calibration.reading import LOADS

__all__ = ["BOX_METHODS_LACK", "TwoPortMethod"]

BOX_METHODS_LACK = (
    "Without switch terms the idle ports are taken as matched: what they reflect stays in the result, about "
    "as much as the load match of the analyzer in S11 and S22 of a part that lets much through, and nothing "
    "in a part that lets nothing through."
)


class TwoPortMethod:
    """Hook-ups in a common order: what hangs on one port, then what joins both.

    Subclasses name the standards that hang on the ports in ``single`` and those between in ``joining``.
    """

    two_port: ClassVar[bool] = True
    without_switch_terms: ClassVar[str] = BOX_METHODS_LACK

    def single(self, options: Options) -> tuple[str, ...]:
        """Standards read on each port."""
        raise NotImplementedError

    def joining(self, options: Options) -> tuple[str, ...]:
        """Standards read between the ports."""
        return ("thru",)

    def takes(self, options: Options = PLAIN) -> tuple[str, ...]:
        """Names of the standards it takes from the kit, with these options."""
        return (*self.single(options), *self.joining(options))

    def required(
        self, ports: tuple[int, ...], isolation: bool = False, options: Options = PLAIN
    ) -> tuple[Hookup, ...]:
        """One hook-up a port and standard, a load on each port if isolation is wanted, then the joins."""
        one = tuple(Hookup.of(name, port) for port in (1, 2) for name in self.single(options))
        joins = tuple(Hookup.of(name, 1, 2) for name in reversed(self.joining(options)))
        return (*one, LOADS, *joins) if isolation else (*one, *joins)
