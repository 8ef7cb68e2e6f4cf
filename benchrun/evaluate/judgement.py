"""One judged limit, in the form that screens, records and the JSON document show."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["JudgedFigure"]


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
        Expanded uncertainty (k = 2) in the same unit; None where none is declared.
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
