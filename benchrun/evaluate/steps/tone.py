"""Level readings to a tone result, with the variations of its uncertainty."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.network import Network
from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.readings import Levels, Raw
from benchrun.evaluate.state import State
from benchrun.hookup import Hookup
from benchrun.rf.tone import Tone as ToneResult
from benchrun.sequence.steps import Tone

__all__ = ["ToneArithmetic"]

_WEAK_DB = 20.0


class ToneArithmetic:
    """Compare what came through the unit with what comes through a thru."""

    def hookups(self, step: Tone, procedure: Procedure) -> tuple[Hookup, ...]:
        """The thru first: it also shows that source and receiver are there, before a unit is connected."""
        ports = procedure.scalar_ports
        return Hookup.of("thru", *ports), Hookup.of("unit", *ports)

    def apply(self, step: Tone, state: State, readings: Mapping[str, Raw]) -> None:
        """Leave a network of kind tone."""
        thru, unit = (readings[h.text] for h in self.hookups(step, state.procedure))
        if not isinstance(thru, Levels) or not isinstance(unit, Levels):
            raise KeyError("a tone needs level readings")
        lost = float((step.grid_dbm() - thru.read_dbm[:, 0]).max())
        if lost > _WEAK_DB:
            raise InvalidMeasurement(
                f"Through the thru {lost:.1f} dB are lost between generator and spectrum analyzer; "
                f"at most {_WEAK_DB:g} dB make sense.",
                "Check that the source is on, and the cables and connections.",
            )
        if np.any(np.diff(thru.read_dbm[:, 0]) <= 0):
            raise InvalidMeasurement(
                "Through the thru the level does not rise with the source's.",
                "The spectrum analyzer or the source is at its end: lower the levels.",
            )
        nominal = ToneResult(thru.read_dbm[:, 0], unit.read_dbm, unit.supply_a)
        terms = state.procedure.level
        varied = terms.vary(nominal) if terms.declared else None
        systematic = 0 if varied is None else len(varied.input_dbm)
        state.networks[step.name] = Network(step.frequencies(), nominal, varied, systematic)
        state.kinds[step.name] = "tone"
