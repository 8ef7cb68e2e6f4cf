"""The test report that build servers read: XML in the form that most of them have in common.

There is no official schema. What is written is what the readers' own schemas agree on (the build tool's from
which the form comes, and a build server's importer): ``testsuites/testsuite/testcase`` with at most one
``failure`` or ``error`` or ``skipped``, counts that equal the children, seconds with a point, and times
without zone.
"""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import datetime

__all__ = ["Case", "Suite", "test_report"]

_FORBIDDEN = re.compile(r"[^\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")
"""What XML 1.0 cannot hold at all (W3C Recommendation, production 2)."""


@dataclass(frozen=True, slots=True)
class Case:
    """One unit's run.

    Parameters
    ----------
    name, group
        Together they must be unique.
    seconds
        How long it took.
    result
        ``"passed"``, ``"failure"``, ``"error"`` or ``"skipped"``.
    kind
        The conclusion, in one word or two.
    text
        What there is to say.
    """

    name: str
    group: str
    seconds: float
    result: str
    kind: str = ""
    text: str = ""


@dataclass(frozen=True, slots=True)
class Suite:
    """One job."""

    name: str
    cases: tuple[Case, ...]


def test_report(suites: Iterable[Suite], hostname: str, began: datetime) -> bytes:
    """The XML document.

    Parameters
    ----------
    suites
        All jobs.
    hostname
        Of the machine.
    began
        When, UTC.

    Examples
    --------
    >>> case = Case("HF-0001", "filters", 1.5, "failure", "fail", "return loss is 12 dB")
    >>> report = test_report([Suite("filters", (case,))], "bench-1", datetime(2026, 3, 1))
    >>> b'<failure message="return loss is 12 dB" type="fail">return loss is 12 dB</failure>' in report
    True
    """
    root = ET.Element("testsuites")
    for suite in suites:
        results = [case.result for case in suite.cases]
        element = ET.SubElement(root, "testsuite", {
            "name": _clean(suite.name), "tests": str(len(results)),
            "failures": str(results.count("failure")), "errors": str(results.count("error")),
            "skipped": str(results.count("skipped")),
            "time": f"{sum(case.seconds for case in suite.cases):.3f}",
            "timestamp": began.strftime("%Y-%m-%dT%H:%M:%S"), "hostname": _clean(hostname),
        })  # fmt: skip
        ET.SubElement(element, "properties")
        for case in suite.cases:
            _case(element, case)
        ET.SubElement(element, "system-out")
        ET.SubElement(element, "system-err")
    ET.indent(root, " ")
    document: bytes = ET.tostring(root, "utf-8", xml_declaration=True)
    return document + b"\n"


def _case(suite: ET.Element, case: Case) -> None:
    facts = {"name": _clean(case.name), "classname": _clean(case.group), "time": f"{case.seconds:.3f}"}
    element = ET.SubElement(suite, "testcase", facts)
    text = _clean(case.text or case.kind)
    if case.result in ("failure", "error"):
        # The text stands twice: some readers show the attribute, others only the body.
        kind = _clean(case.kind.replace(" ", "-"))
        ET.SubElement(element, case.result, {"message": text, "type": kind}).text = text
    elif case.result == "skipped":
        ET.SubElement(element, "skipped", {"message": text})
    elif case.text:
        ET.SubElement(element, "system-out").text = text


def _clean(text: str) -> str:
    return _FORBIDDEN.sub("?", text)
