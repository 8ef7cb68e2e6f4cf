"""One judged limit, in the form that screens, records and the JSON document show."""

from __future__ import annotations

import math
from dataclasses import dataclass

from benchrun.uncertainty.decision import Conclusion, Rule, conclude

__all__ = ["JudgedFigure", "not_told", "told"]


@dataclass(frozen=True, slots=True)
class JudgedFigure:
    """A figure against one limit.

    Parameters
    ----------
    name
        What was judged, in words: ``"insertion loss, 160 MHz to 175 MHz"``.
    value
        Measured value in ``unit``; None where it could not be told.
    unit
        ``"dB"``, ``"Hz"``, ``"s"``, ``"deg"`` or ``"1"``: SI throughout.
    limit
        The limit in the same unit.
    side
        ``"at most"`` or ``"at least"``.
    margin
        Positive inside the limit, in the same unit.
    uncertainty
        Expanded uncertainty (k = 2) in the same unit, towards the limit where it is not symmetric; None
        where none is declared or it cannot be resolved.
    at_hz
        Frequency at which the value was found; None where there is none.
    conclusion
        One of the six conclusions.
    rule
        The decision rule in words, with its standard.
    risk
        Probability that the unit does not conform although accepted, or conforms although rejected
        (JCGM 106:2012, 9.3), for this one decision; None without uncertainty.
    remark
        Why a value is missing, or that it is not resolvable.
    """

    name: str
    value: float | None
    unit: str
    limit: float
    side: str
    margin: float | None
    uncertainty: float | None
    at_hz: float | None
    conclusion: str
    rule: str = ""
    risk: float | None = None
    remark: str = ""


def not_told(
    name: str, unit: str, limit: float, side: str, rule: Rule, why: str, failed: bool
) -> JudgedFigure:
    """A figure that the trace does not have: a fail where that alone shows non-conformity, else invalid."""
    conclusion = Conclusion.FAIL if failed else Conclusion.INVALID
    return JudgedFigure(
        name,
        None,
        unit,
        limit,
        side,
        None,
        None,
        None,
        conclusion.value,
        rule.text,
        None,
        f"not found: {why}",
    )


def told(
    name: str,
    value: float,
    unit: str,
    limit: float,
    side: str,
    at_hz: float,
    rule: Rule,
    up: float | None,
    down: float | None,
) -> JudgedFigure:
    """Judge a value.

    Parameters
    ----------
    up, down
        Expanded uncertainty upwards and downwards in ``unit``; infinite or nan where it is not resolvable,
        None where none is declared.
    """
    towards, away = (up, down) if side == "at most" else (down, up)
    margin = limit - value if side == "at most" else value - limit
    if margin < 0 and towards is not None and away is not None and math.isfinite(towards + away):
        towards, away = away, towards  # from outside, the limit lies the other way
    if towards is None or away is None or math.isfinite(towards):
        verdict = conclude(value, limit, side, towards, rule)
        remark = "no uncertainty is declared" if towards is None and rule.factor else ""
        return JudgedFigure(
            name=name,
            value=value,
            unit=unit,
            limit=limit,
            side=side,
            margin=verdict.margin,
            uncertainty=towards,
            at_hz=at_hz,
            conclusion=verdict.conclusion.value,
            rule=rule.text,
            risk=verdict.risk,
            remark=remark,
        )
    # The uncertainty reaches zero magnitude. Only a value that stays outside the limit on its resolvable
    # side too is shown not to conform; anything else proves nothing.
    outside = margin < 0 and math.isfinite(away) and -margin > away * max(rule.factor, 1.0)
    conclusion = Conclusion.FAIL if outside else Conclusion.INVALID
    return JudgedFigure(
        name, value, unit, limit, side, margin, None, at_hz, conclusion.value, rule.text, None,
        "not resolvable: the uncertainty is as large as the value",
    )  # fmt: skip
