"""The JSON document of a run."""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import TYPE_CHECKING

from benchrun.uncertainty.decision import worst

if TYPE_CHECKING:
    from benchrun.engine.run import Outcome

__all__ = ["document"]

_KEYS = ("name", "value", "unit", "limit", "margin", "uncertainty", "at_hz", "conclusion")


def document(outcomes: Sequence[Outcome]) -> str:
    """One unit's document, or one with the worst conclusion and each unit's under ``units``."""
    each = [_one(outcome) for outcome in outcomes]
    if len(each) == 1:
        return json.dumps(each[0], ensure_ascii=False)
    together = {"conclusion": worst(o.conclusion for o in outcomes).value, "units": each}
    return json.dumps(together, ensure_ascii=False)


def _one(outcome: Outcome) -> dict[str, object]:
    found: dict[str, object] = {
        "conclusion": outcome.conclusion.value,
        "record": str(outcome.record) if outcome.record else None,
        "unit": outcome.unit,
        "simulated": outcome.origin != "measured",
        "figures": [{key: getattr(figure, key) for key in _KEYS} for figure in outcome.figures],
    }
    for key in ("reason", "advice", "trouble"):
        if text := getattr(outcome, key):
            found[key] = text
    if outcome.left_on:
        found["left_on"] = list(outcome.left_on)
    return found
