"""How each step kind is carried out at a bench, one file a kind; this table knows them all."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchrun.engine.steps.base import AtWork, Execution
from benchrun.engine.steps.calibrate import CalibrateExecution
from benchrun.engine.steps.deembed import DeEmbedExecution
from benchrun.engine.steps.expect import ExpectExecution
from benchrun.engine.steps.judge import JudgeExecution
from benchrun.engine.steps.sweep import SweepExecution
from benchrun.engine.steps.tone import ToneExecution

__all__ = ["EXECUTIONS", "AtWork", "Execution"]

EXECUTIONS: Mapping[str, Execution[Any]] = {
    "calibrate": CalibrateExecution(),
    "sweep": SweepExecution(),
    "de-embed": DeEmbedExecution(),
    "tone": ToneExecution(),
    "judge": JudgeExecution(),
    "expect": ExpectExecution(),
}
"""By the kind of the step, as written in a sequence."""
