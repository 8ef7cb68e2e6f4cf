"""The arithmetic of each step kind, one file each; this table is the only place that knows them all."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchrun.evaluate.steps.base import Arithmetic
from benchrun.evaluate.steps.calibrate import CalibrateArithmetic
from benchrun.evaluate.steps.deembed import DeEmbedArithmetic
from benchrun.evaluate.steps.expect import ExpectArithmetic
from benchrun.evaluate.steps.judge import JudgeArithmetic
from benchrun.evaluate.steps.sweep import SweepArithmetic
from benchrun.evaluate.steps.tone import ToneArithmetic

__all__ = ["ARITHMETIC", "Arithmetic"]

ARITHMETIC: Mapping[str, Arithmetic[Any]] = {
    "calibrate": CalibrateArithmetic(),
    "sweep": SweepArithmetic(),
    "de-embed": DeEmbedArithmetic(),
    "tone": ToneArithmetic(),
    "judge": JudgeArithmetic(),
    "expect": ExpectArithmetic(),
}
"""By the kind of the step, as written in a sequence."""
