"""Step kinds, one file each; this table is the only place that knows them all."""

from __future__ import annotations

from collections.abc import Mapping

from benchrun.sequence.steps.base import StepModel
from benchrun.sequence.steps.calibrate import Calibrate
from benchrun.sequence.steps.deembed import DeEmbed
from benchrun.sequence.steps.expect import Expect
from benchrun.sequence.steps.judge import Judge
from benchrun.sequence.steps.sweep import Sweep
from benchrun.sequence.steps.tone import Tone

__all__ = ["STEP_KINDS", "Calibrate", "DeEmbed", "Expect", "Judge", "StepModel", "Sweep", "Tone"]

STEP_KINDS: Mapping[str, type[StepModel]] = {
    kind.kind: kind for kind in (Calibrate, Sweep, DeEmbed, Tone, Judge, Expect)
}
