"""Doubting the readings of a calibration while hands are still at it: made again, or the end."""

from __future__ import annotations

from benchrun.engine.events import Noted
from benchrun.engine.steps.base import AtWork, read
from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.chain import hookups
from benchrun.evaluate.readings import two_ports
from benchrun.evaluate.steps.calibrate import ADVICE, sure_doubts
from benchrun.hookup import Hookup
from benchrun.rf.calibration.suspicion import Suspicion, unsteady
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.steps import Calibrate

__all__ = ["Doubting"]


class Doubting:
    """Looks at the readings so far after each one, and has a suspect connection made again, once.

    Parameters
    ----------
    step, work
        The calibration, and what it may use.
    """

    def __init__(self, step: Calibrate, work: AtWork) -> None:
        self._step, self._work = step, work
        self._hookups = {hookup.text: hookup for hookup in hookups(step, work.procedure)}
        self._wandering: dict[str, Suspicion] = {}
        self._again: list[str] = []

    def __call__(self, hookup: Hookup) -> None:
        """After the reading of a hook-up.

        Raises
        ------
        InvalidMeasurement
            If a connection stays suspicious when it was made again.
        """
        self._sweep_again(hookup)
        while doubts := self._doubts():
            fresh = [doubt for doubt in doubts if doubt.hookup not in self._again]
            if not fresh:
                # Two that read alike are both named: which of them it is only hands can see now.
                names = " and ".join(dict.fromkeys(doubt.hookup for doubt in doubts))
                raise InvalidMeasurement(f"{names}, connected again: {doubts[0].reason}", ADVICE)
            self._repeat(fresh[0])

    def _doubts(self) -> list[Suspicion]:
        readings = two_ports(self._work.kept.of(self._step.name))
        return [*self._wandering.values(), *sure_doubts(self._step, self._work.procedure, readings)]

    def _repeat(self, doubt: Suspicion) -> None:
        work, hookup = self._work, self._hookups[doubt.hookup]
        self._again.append(doubt.hookup)
        text = f"{doubt.hookup}: {doubt.reason} Connect it once more; the reading is replaced."
        work.emit(Noted(text=text, weight="warning"))
        work.standing = None
        read(self._step, work, hookup)
        self._sweep_again(hookup)

    def _sweep_again(self, hookup: Hookup) -> None:
        """Sweep once more without touching anything: a loose contact is another one each time."""
        analyzer = self._work.analyzer
        assert analyzer is not None  # it has just swept
        if analyzer.replayed or not self._work.twice:
            return
        kept = self._work.kept.of(self._step.name)[hookup.text]
        assert isinstance(kept, TwoPort)  # an analyzer's reading
        doubt = unsteady(hookup.text, kept, analyzer.sweep().raw)
        self._wandering.pop(hookup.text, None)
        if doubt is not None:
            self._wandering[hookup.text] = doubt
