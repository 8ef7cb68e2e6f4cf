"""The test report: well-formed, counted, and with what its readers need."""

from __future__ import annotations

import xml.etree.ElementTree as ET
from datetime import UTC, datetime

from hypothesis import given
from hypothesis import strategies as st

from benchrun.report import test_report as module
from benchrun.report.test_report import Case, Suite

BEGAN = datetime(2026, 3, 1, 12, 30, 5, 250_000, tzinfo=UTC)
CASES = (
    Case("a", "job", 1.25, "passed", "pass"),
    Case("b", "job", 0.5, "failure", "conditional fail", "return loss <12 dB & falling"),
    Case("c", "job", 0.0, "error", "invalid", "an overload"),
    Case("d", "job", 0.0, "skipped", "not run", "time was over"),
    Case("e", "job", 2.0, "passed", "conditional pass", "only 0.1 dB inside"),
)


def parsed(cases=CASES, hostname="bench-1"):
    return ET.fromstring(module.test_report([Suite("job", cases)], hostname, BEGAN))


def test_counts_equal_the_children():
    root = parsed()
    assert root.tag == "testsuites"
    (suite,) = root
    assert {k: suite.get(k) for k in ("tests", "failures", "errors", "skipped")} == {
        "tests": "5", "failures": "1", "errors": "1", "skipped": "1"
    }  # fmt: skip
    assert suite.get("time") == "3.750"
    assert suite.get("timestamp") == "2026-03-01T12:30:05"
    assert [child.tag for child in suite] == ["properties", *["testcase"] * 5, "system-out", "system-err"]


def test_each_case_has_at_most_one_result():
    cases = parsed().findall("testsuite/testcase")
    assert [[child.tag for child in case] for case in cases] == [
        [], ["failure"], ["error"], ["skipped"], ["system-out"]
    ]  # fmt: skip
    failure = cases[1].find("failure")
    assert failure is not None
    assert (failure.get("type"), failure.get("message")) == ("conditional-fail", failure.text)
    assert failure.text == "return loss <12 dB & falling"
    assert all(case.get("classname") == "job" for case in cases)


@given(st.text())
def test_any_text_makes_a_document_that_can_be_read(text):
    root = parsed((Case(text, text, 0.0, "failure", text, text),), text)
    assert len(root.findall("testsuite/testcase/failure")) == 1
