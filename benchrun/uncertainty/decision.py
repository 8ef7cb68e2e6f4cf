"""Decision rules: from a value, its uncertainty and a limit to a conclusion.

Sources: ILAC-G8:09/2019, 4.2.1 (simple acceptance), 4.2.2 (guard band), 4.2.3 (non-binary);
JCGM 106:2012, clause 7 (conformance probability) and 9.3 (specific risk), clause numbers from memory.

Equality is not settled by those texts. Here a value exactly at an acceptance limit is inside it: at the
limit itself a unit conforms, and a rule that rejects it would disagree with the specification's "at most".
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from enum import StrEnum

__all__ = ["COVERAGE_FACTOR", "Conclusion", "Rule", "Verdict", "conclude", "worst"]

COVERAGE_FACTOR = 2.0
"""k of every expanded uncertainty in the project (about 95 %, normal)."""


class Conclusion(StrEnum):
    """What a limit, or a run, comes to; in order from best to worst."""

    PASS = "pass"
    CONDITIONAL_PASS = "conditional pass"
    CONDITIONAL_FAIL = "conditional fail"
    FAIL = "fail"
    INVALID = "invalid"
    STOPPED = "stopped"

    @property
    def severity(self) -> int:
        """0 for pass, rising."""
        return list(Conclusion).index(self)

    @property
    def exit_code(self) -> int:
        """Exit code of a run with this conclusion."""
        return {
            "pass": 0,
            "conditional pass": 0,
            "conditional fail": 1,
            "fail": 1,
            "invalid": 3,
            "stopped": 4,
        }[self]


def worst(conclusions: Iterable[Conclusion]) -> Conclusion:
    """Pick the worst of several; nothing judged is invalid, for nothing was shown.

    Examples
    --------
    >>> worst([Conclusion.PASS, Conclusion.CONDITIONAL_FAIL]).value
    'conditional fail'
    >>> worst([]).value
    'invalid'
    """
    return max(conclusions, key=lambda c: c.severity, default=Conclusion.INVALID)


@dataclass(frozen=True, slots=True)
class Rule:
    """A decision rule.

    Parameters
    ----------
    kind
        ``"simple"``, ``"guard band"`` or ``"non-binary"``.
    factor
        r in w = r U; 0 for simple acceptance, negative for guarded rejection.
    """

    kind: str = "simple"
    factor: float = 0.0

    @property
    def text(self) -> str:
        """The rule in words, with the clause it stands on."""
        if self.kind == "simple":
            return "simple acceptance (ILAC-G8:09/2019, 4.2.1)"
        clause = "4.2.2" if self.kind == "guard band" else "4.2.3"
        return f"{self.kind}, w = {self.factor:g} U, k = {COVERAGE_FACTOR:g} (ILAC-G8:09/2019, {clause})"


@dataclass(frozen=True, slots=True)
class Verdict:
    """What the rule says.

    Parameters
    ----------
    conclusion
        Pass to fail, or invalid where the rule needs an uncertainty and there is none.
    margin
        Positive inside the limit, in the unit of the value.
    guard_band
        w, in the same unit.
    risk
        If accepted, the probability that the unit does not conform; if rejected, that it does. None
        without uncertainty.
    """

    conclusion: Conclusion
    margin: float
    guard_band: float
    risk: float | None


def conclude(value: float, limit: float, side: str, expanded: float | None, rule: Rule) -> Verdict:
    """Apply a rule to one value and one limit.

    Parameters
    ----------
    value, limit
        In the same unit.
    side
        ``"at most"`` or ``"at least"``.
    expanded
        Expanded uncertainty U (k = 2), not negative; None where none is declared. One that is not
        finite could not be worked out, and then nothing is concluded.
    rule
        The rule.

    Returns
    -------
    Verdict

    Examples
    --------
    >>> conclude(0.40, 0.45, "at most", 0.03, Rule("guard band", 1.0)).conclusion.value
    'pass'
    >>> conclude(0.43, 0.45, "at most", 0.03, Rule("guard band", 1.0)).conclusion.value
    'fail'
    >>> conclude(0.43, 0.45, "at most", 0.03, Rule("non-binary", 1.0)).conclusion.value
    'conditional pass'
    """
    margin = limit - value if side == "at most" else value - limit
    unknown = rule.factor != 0 if expanded is None else not math.isfinite(expanded)
    if unknown or not math.isfinite(margin):
        return Verdict(Conclusion.INVALID, margin, math.nan, None)
    width = rule.factor * (expanded or 0.0)
    if rule.kind == "non-binary":
        if margin >= width:
            conclusion = Conclusion.PASS
        elif margin >= 0:
            conclusion = Conclusion.CONDITIONAL_PASS
        else:
            conclusion = Conclusion.CONDITIONAL_FAIL if margin >= -width else Conclusion.FAIL
    else:
        conclusion = Conclusion.PASS if margin >= width else Conclusion.FAIL
    accepted = conclusion in (Conclusion.PASS, Conclusion.CONDITIONAL_PASS)
    return Verdict(conclusion, margin, width, _risk(margin, expanded, accepted))


def _risk(margin: float, expanded: float | None, accepted: bool) -> float | None:
    """JCGM 106:2012, one-sided conformance probability Phi(margin / u)."""
    if expanded is None:
        return None
    standard = expanded / COVERAGE_FACTOR
    if standard == 0:
        return float(accepted != (margin >= 0))
    # The tail itself, never one less its complement: small risks keep their digits.
    distance = margin / standard / math.sqrt(2.0)
    return 0.5 * math.erfc(distance if accepted else -distance)
