"""A night as one JSON document and as suites of a test report."""

from __future__ import annotations

from collections import Counter
from typing import TYPE_CHECKING, Any

from benchrun.evaluate.judgement import JudgedFigure
from benchrun.report.test_report import Case, Suite
from benchrun.report.words import outside

if TYPE_CHECKING:
    from benchrun.engine.overnight import NightResult

__all__ = ["night_document", "suites"]

_RESULTS = {
    "pass": "passed", "conditional pass": "passed", "fail": "failure", "conditional fail": "failure",
    "invalid": "error", "stopped": "error",
}  # fmt: skip


def night_document(result: NightResult) -> dict[str, Any]:
    """Everything, as plain data.

    Parameters
    ----------
    result
        The night.
    """
    counted = Counter(
        unit["conclusion"]
        for found in result.answers.values()
        for answer in found
        for unit in answer["units"]
    )
    return {
        "night": result.night,
        "title": result.title,
        "exit_code": result.exit_code,
        "seconds": round(result.seconds, 3),
        "conclusions": dict(sorted(counted.items())),
        "without_conclusion": sum(not a["units"] for found in result.answers.values() for a in found),
        "jobs": [{"job": job, "runs": found} for job, found in result.answers.items()],
    }


def suites(result: NightResult) -> list[Suite]:
    """One suite a job, one case a unit's run.

    Parameters
    ----------
    result
        The night.
    """
    return [
        Suite(job, tuple(case for number, one in enumerate(found, 1) for case in _cases(job, number, one)))
        for job, found in result.answers.items()
    ]


def _cases(job: str, number: int, answer: dict[str, Any]) -> list[Case]:
    if not answer["units"]:
        result = "skipped" if answer["trouble"].startswith("not run") else "error"
        return [Case(f"run {number}", job, answer["seconds"], result, "not run", answer["trouble"])]
    share = answer["seconds"] / len(answer["units"])
    return [
        Case(
            f"{unit['unit']}, run {number}", job, share,
            "error" if unit["trouble"] else _RESULTS[unit["conclusion"]], unit["conclusion"], _text(unit),
        )
        for unit in answer["units"]
    ]  # fmt: skip


def _text(unit: dict[str, Any]) -> str:
    lines = [unit["trouble"], unit["reason"], *(f"STILL ON: {text}" for text in unit["left_on"])]
    figures = [JudgedFigure(**figure) for figure in unit["figures"]]
    lines += [f"{f.conclusion}: {outside(f)}" for f in figures if f.conclusion != "pass"]
    return "\n".join(line for line in lines if line)
