"""Carrying out a tone: each connection, each source level, each harmonic."""

from __future__ import annotations

import numpy as np

from benchrun.engine.events import ReadingTaken
from benchrun.engine.kept import Reading
from benchrun.engine.steps.base import AtWork
from benchrun.evaluate.chain import apply, hookups
from benchrun.evaluate.readings import Levels
from benchrun.quantity import Dimension, render
from benchrun.sequence.steps import Tone

__all__ = ["ToneExecution"]

_HEADROOM_DB = 3.0
"""How far above the level expected the spectrum analyzer's range is set."""


class ToneExecution:
    """Drive, read."""

    def words(self, step: Tone, work: AtWork) -> str:
        """Carrier, levels, harmonics."""
        levels = step.grid_dbm()
        span = f"{levels[0]:g} dBm" if len(levels) == 1 else f"{levels[0]:g} to {levels[-1]:g} dBm"
        more = f", harmonics to {step.harmonics}" if step.harmonics > 1 else ""
        return f"{render(step.at, Dimension.FREQUENCY)} at {span}{more}, against a thru"

    def carry_out(self, step: Tone, work: AtWork) -> None:
        """Read the thru and the unit; the source is off while hands are at work."""
        generator, spectrum = work.generator, work.spectrum
        if generator is None or spectrum is None:
            raise RuntimeError("a tone was planned for a bench without generator and spectrum analyzer")
        levels, frequencies = step.grid_dbm(), step.frequencies()
        gain = work.procedure.sequence.unit.gain
        for hookup in hookups(step, work.procedure):
            work.connect(hookup)
            # Of the thru only the carrier is wanted: the source's own harmonics are no result.
            through_unit = any("unit" in c.items for c in hookup.connections)
            wanted = frequencies if through_unit else frequencies[:1]
            expected_db = _HEADROOM_DB + (max(gain, 0.0) if through_unit else 0.0)
            read, drawn = np.empty((len(levels), len(wanted))), np.empty(len(levels))
            for i, level in enumerate(levels):
                generator.tone(step.at, float(level))
                for j, frequency in enumerate(wanted):
                    read[i, j] = spectrum.level(float(frequency), step.bandwidth, float(level) + expected_db)
                generator.check()
                drawn[i] = work.drawn_a()
            generator.off()
            raw = Levels(levels, read, drawn)
            reading = work.kept.add(Reading.of(step.name, hookup.text, wanted, raw, work.clock.seconds()))
            work.emit(
                ReadingTaken(step=step.name, hookup=hookup.text, points=read.size, sha256=reading.sha256)
            )
        apply(step, work.state, work.kept.of(step.name))
