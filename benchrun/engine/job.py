"""What is to be run, and what one unit's run came to."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, Protocol

from benchrun.clock import Clock
from benchrun.engine.events import Sink
from benchrun.engine.journal import Appended, Opener
from benchrun.engine.operators import Operator
from benchrun.engine.plan import Plan
from benchrun.evaluate.judgement import JudgedFigure
from benchrun.record.signer import Signer
from benchrun.record.storage import DISK, Storage
from benchrun.uncertainty.decision import Conclusion

if TYPE_CHECKING:
    from benchrun.engine.story import Story

__all__ = ["Desk", "Job", "Orders", "Outcome", "Turn"]


@dataclass(frozen=True, slots=True)
class Orders:
    """What the command line said beyond the plan, so that another process can take the run up again.

    Parameters
    ----------
    key
        Name of the key that signs; empty: the only one.
    faults
        Of the simulated bench.
    unattended, batch
        Who is there, and whether units are asked for one by one.
    label
        For whoever started the run and wants to know it again.
    """

    key: str = ""
    faults: tuple[str, ...] = ()
    unattended: bool = False
    batch: bool = False
    label: str = ""


@dataclass(frozen=True, slots=True)
class Turn:
    """One unit whose turn it is.

    Parameters
    ----------
    serial
        Its serial number.
    retest
        Why it is tested once more; empty the first time.
    """

    serial: str
    retest: str = ""


class Desk(Protocol):
    """Says which unit comes next: where units are not known when a run starts."""

    def next(self) -> Turn | None:
        """The next unit; None when there are no more.

        Raises
        ------
        Stopped
            If the operator ends the run.
        """
        ...


@dataclass(frozen=True, slots=True)
class Outcome:
    """What one unit's run came to.

    Parameters
    ----------
    unit
        Serial number.
    conclusion, reason, advice
        The worst of all figures, or why there is none.
    figures
        All judged limits.
    origin
        ``"measured"``, ``"simulated"`` or ``"recorded"``.
    record
        The record's folder; None if there is none.
    trouble
        Why there is no record where it should be.
    left_on
        Sources that could not be switched off.
    bench_s
        How long it took on the bench's clock, seconds.
    """

    unit: str
    conclusion: Conclusion
    reason: str = ""
    advice: str = ""
    figures: tuple[JudgedFigure, ...] = ()
    origin: str = "measured"
    record: Path | None = None
    trouble: str = ""
    left_on: tuple[str, ...] = ()
    bench_s: float = 0.0

    @property
    def exit_code(self) -> int:
        """5 if the record is not where it should be, else that of the conclusion."""
        return 5 if self.trouble else self.conclusion.exit_code


def _nobody(outcome: Outcome) -> None:
    """Nobody wants to know before the end."""


@dataclass(frozen=True, slots=True)
class Job:
    """What is to be run, where, and who takes part.

    Parameters
    ----------
    plan
        The plan.
    units
        Serial numbers, tested one after the other.
    operator_name
        Goes into the record.
    hands
        Who connects things.
    clock
        Bench time.
    records
        Folder of records.
    signer
        Gives the key for ``"measured"``, ``"simulated"`` or ``"recorded"`` readings; raises
        :class:`InputError` if there is none.
    sink
        Who is told what happens.
    library
        A VISA library instead of the bench file's; the rehearsal's.
    seed
        Of the simulated bench.
    storage
        Where records are written.
    desk
        Gives further units after ``units``; then each record is finished while the next is connected.
    orders
        How it was started, for whoever takes it up again.
    story
        What an earlier process did of it: it is taken up again.
    concluded, kept
        Told of each unit, in the calling thread, when its conclusion is there, and when its record is (or is
        not).
    opener
        Opens the journal's file.
    """

    plan: Plan
    units: tuple[str, ...]
    operator_name: str
    hands: Operator
    clock: Clock
    records: Path
    signer: Callable[[str], Signer]
    sink: Sink
    library: Any = None
    seed: int | None = None
    storage: Storage = DISK
    desk: Desk | None = None
    orders: Orders = Orders()
    story: Story | None = None
    concluded: Callable[[Outcome], None] = _nobody
    kept: Callable[[Outcome], None] = _nobody
    opener: Opener = Appended
