"""What a step kind contributes to a run, and what it finds there."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Protocol, TypeVar

from benchrun.clock import Clock
from benchrun.engine.emitter import Emitter
from benchrun.engine.events import Noted, Prompted, ReadingTaken
from benchrun.engine.kept import Kept, Reading
from benchrun.engine.operators import Operator
from benchrun.evaluate.chain import apply, hookups
from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.state import State
from benchrun.hookup import Hookup
from benchrun.instruments.analyzer import NetworkAnalyzer, SweepSettings
from benchrun.instruments.generator import SignalGenerator
from benchrun.instruments.spectrum import SpectrumAnalyzer
from benchrun.instruments.supply import Supply
from benchrun.sequence.steps import StepModel

__all__ = ["AtWork", "Execution", "carry_out", "read"]

S = TypeVar("S", bound=StepModel, contravariant=True)


@dataclass(slots=True)
class AtWork:
    """What a step may use.

    Parameters
    ----------
    procedure, state
        The arithmetic, and what it has found for this unit.
    analyzer, generator, spectrum
        The instruments, as far as the sequence needs them.
    operator, clock
        Who connects, and the bench's time.
    kept
        Readings of this unit's record; :meth:`Kept.add` makes them safe.
    emit
        Says what happens.
    standing
        What is connected now; hands are asked only for a change.
    twice
        Sweep every connection of a calibration a second time, and doubt one that does not read the same: a
        loose load shows in no other way.
    """

    procedure: Procedure
    state: State
    analyzer: NetworkAnalyzer | None
    operator: Operator
    clock: Clock
    kept: Kept
    emit: Emitter
    standing: Hookup | None = None
    generator: SignalGenerator | None = None
    spectrum: SpectrumAnalyzer | None = None
    supply: Supply | None = None
    twice: bool = False

    def connect(self, hookup: Hookup) -> None:
        """Have a connection made, if it does not stand; a unit is fed only while it is connected.

        Raises
        ------
        BenchError
            If the supply does not do what it should.
        Stopped
            If the operator ends the run.
        """
        if hookup == self.standing:
            return
        if self.supply is not None and self.supply.on:
            self.supply.off()
            self.emit(Noted(text="supply off"))
        self.emit(Prompted(hookup=hookup.text))
        self.operator.connect(hookup)
        self.standing = hookup
        feed = self.procedure.sequence.unit.supply
        if (
            self.supply is not None
            and feed is not None
            and any("unit" in c.items for c in hookup.connections)
        ):
            drawn = self.supply.feed(feed.voltage, feed.current)
            self.emit(Noted(text=f"supply on: {feed.voltage:g} V, {1e3 * drawn:.1f} mA"))

    def drawn_a(self) -> float:
        """Supply current now, in ampere; nan without a supply.

        Raises
        ------
        InvalidMeasurement
            If the supply tripped.
        """
        feed = self.procedure.sequence.unit.supply
        if self.supply is None or feed is None or not self.supply.on:
            return math.nan
        return self.supply.current(feed.voltage, feed.current)


class Execution(Protocol[S]):
    """One step kind."""

    def words(self, step: S, work: AtWork) -> str:
        """What the step will do, in a few words."""
        ...

    def carry_out(self, step: S, work: AtWork) -> None:
        """Do it.

        Raises
        ------
        BenchError
            If an instrument or a reading cannot be trusted.
        Stopped
            If the operator ends the run.
        """
        ...


def read(step: StepModel, work: AtWork, hookup: Hookup) -> None:
    """Have a hook-up made if it does not stand, sweep it as the analyzer is set up, and keep the reading.

    A reading kept before for the same hook-up stays in the record, and the new one takes its place.
    """
    assert work.analyzer is not None  # it was set up
    setup = work.procedure.sequence.sweep_of(step)
    work.connect(hookup)
    if setup.settle:
        work.clock.wait(setup.settle)
    swept = work.analyzer.sweep()
    reading = work.kept.add(Reading.of(step.name, hookup.text, swept.f_hz, swept.raw, work.clock.seconds()))
    work.emit(ReadingTaken(step=step.name, hookup=hookup.text, points=len(swept.f_hz), sha256=reading.sha256))


def carry_out(
    step: StepModel,
    work: AtWork,
    last: Callable[[StepModel, AtWork], None] | None = None,
    after: Callable[[Hookup], None] | None = None,
) -> None:
    """Read what a step needs read, then do its arithmetic: all that most kinds need.

    Parameters
    ----------
    step, work
        The step, and what it may use.
    last
        Called after the last reading, while its hook-up still stands.
    after
        Called after each reading; it may have others made again.
    """
    needed, analyzer = hookups(step, work.procedure), work.analyzer
    if needed:
        if analyzer is None:
            raise RuntimeError("a sweep was planned for a bench without network analyzer")
        setup = work.procedure.sequence.sweep_of(step)
        spacing = "list" if setup.at is not None else setup.spacing
        analyzer.set_up(SweepSettings(setup.grid(), spacing, setup.bandwidth, setup.power, setup.averages))
        for hookup in needed:
            read(step, work, hookup)
            if after is not None:
                after(hookup)
    if last is not None:
        if analyzer is not None and needed and work.standing != needed[-1]:
            work.connect(needed[-1])  # something before it was made again
            analyzer.sweep()
        last(step, work)
    apply(step, work.state, work.kept.of(step.name))
    if step.name in work.state.agreements:
        work.emit(Noted(text=f"scikit-rf agrees within {work.state.agreements[step.name]:.0e}"))
