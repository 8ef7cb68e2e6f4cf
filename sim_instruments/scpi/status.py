"""Status reporting (IEEE 488.2 chapter 11, SCPI-1999 Volume 2 chapter 20): registers and the error queue."""

from __future__ import annotations

from collections import deque

from sim_instruments.scpi.errors import ScpiError, event_bit

__all__ = ["Register", "Status"]


class Register:
    """Condition, transition filters, event, enable."""

    def __init__(self) -> None:
        self.condition = 0
        self.event = 0
        self.preset()

    def preset(self) -> None:
        """Filters and enable as STATus:PRESet leaves them."""
        self.enable, self.ptransition, self.ntransition = 0, 0x7FFF, 0

    def update(self, condition: int) -> None:
        """Set the condition; changes that pass the filters become events."""
        rose, fell = condition & ~self.condition, self.condition & ~condition
        self.event |= (rose & self.ptransition) | (fell & self.ntransition)
        self.condition = condition

    def put(self, bit: int, on: bool) -> None:
        """One bit of the condition."""
        self.update(self.condition | (1 << bit) if on else self.condition & ~(1 << bit))

    def take_event(self) -> int:
        """Read and clear."""
        event, self.event = self.event, 0
        return event

    @property
    def summary(self) -> bool:
        """Whether an enabled event stands."""
        return bool(self.event & self.enable)


class Status:
    """Everything an instrument reports of itself.

    Parameters
    ----------
    queue
        How many entries the error queue holds; SCPI asks for two at least (Vol. 2, 21.8, from memory).
    """

    def __init__(self, queue: int = 20) -> None:
        self.queue = queue
        self.errors: deque[str] = deque()
        self.operation, self.questionable = Register(), Register()
        self.esr, self.ese, self.sre = 128, 0, 0  # power on

    def report(self, error: ScpiError) -> None:
        """Queue an error; a full queue keeps its oldest and ends in -350, which is an event of its own."""
        self.esr |= event_bit(error.number)
        if len(self.errors) < self.queue:
            self.errors.append(error.entry)
        else:
            self.errors[-1] = ScpiError(-350).entry
            self.esr |= event_bit(-350)

    def next_error(self) -> str:
        """Oldest first."""
        return self.errors.popleft() if self.errors else ScpiError(0).entry

    def clear(self) -> None:
        """``*CLS``: events and errors, not the enables."""
        self.errors.clear()
        self.esr = self.operation.event = self.questionable.event = 0

    def take_esr(self) -> int:
        """Read and clear."""
        esr, self.esr = self.esr, 0
        return esr

    def byte(self, message_available: bool) -> int:
        """The status byte, with the master summary in bit 6."""
        bits = (
            (4 if self.errors else 0)
            | (8 if self.questionable.summary else 0)
            | (16 if message_available else 0)
            | (32 if self.esr & self.ese else 0)
            | (128 if self.operation.summary else 0)
        )
        return bits | (64 if bits & self.sre & ~64 else 0)
