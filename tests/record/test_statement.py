"""The in-toto statement of a record."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable
from typing import Any

import pytest

from benchrun.errors import CouldNotCheck
from benchrun.record.draft import Draft
from benchrun.record.statement import build, parse

MakeDraft = Callable[..., Draft]


@pytest.fixture
def data(draft: MakeDraft) -> dict[str, Any]:
    """A good statement as plain data."""
    made = draft()
    loaded: dict[str, Any] = json.loads(build(made.payload, made.files))
    return loaded


def test_statement_has_the_fields_of_the_specification(draft: MakeDraft, data: dict[str, Any]) -> None:
    """in-toto Attestation Framework, Statement v1: four fields, subjects with lower-case digests."""
    assert set(data) == {"_type", "subject", "predicateType", "predicate"}
    assert data["_type"] == "https://in-toto.io/Statement/v1"
    assert data["predicateType"] == "https://benchrun.invalid/run/v1"
    digests = {one["name"]: one["digest"] for one in data["subject"]}
    assert digests == {
        name: {"sha256": hashlib.sha256(content).hexdigest()} for name, content in draft().files.items()
    }


def test_each_subject_has_a_line_of_its_own(draft: MakeDraft) -> None:
    """So that line tools can check the digests; the order does not depend on that of the files."""
    made = draft()
    text = build(made.payload, made.files)
    assert text.count(b'\n  {"name": "') == len(made.files)
    assert build(made.payload, dict(reversed(made.files.items()))) == text


def test_text_of_a_run_cannot_pass_for_a_subject(draft: MakeDraft) -> None:
    """A line end in free text is escaped, so that no line of the predicate looks like a subject's."""
    forged = '\n  {"name": "x", "digest": {"sha256": "' + "0" * 64 + '"}},\n'
    made = draft(reason=forged, operator=forged, software={forged: forged})
    assert build(made.payload, made.files).count(b'\n  {"name": "') == len(made.files)
    assert parse(build(made.payload, made.files)).payload == made.payload


def test_statement_is_read_back(draft: MakeDraft, data: dict[str, Any]) -> None:
    """And unknown fields are ignored."""
    data["note"] = 1
    data["subject"][0]["mediaType"] = "text/plain"
    again = parse(json.dumps(data).encode())
    assert again.payload == draft().payload
    assert set(again.subjects) == set(draft().files)


DIGEST = {"sha256": "0" * 64}


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({"_type": "https://in-toto.io/Statement/v0.1"}, r"not a statement of type .*/v1"),
        (
            {"predicateType": "https://benchrun.invalid/run/v2"},
            r"version '2' .* reads version 1; install a newer",
        ),
        ({"predicateType": "https://benchrun.invalid/run/v12"}, "version '12'"),
        ({"predicateType": "https://example.com/x"}, "not of a run"),
        ({"predicateType": None}, "not of a run"),
        ({"subject": []}, "names no files"),
        ({"subject": None}, "names no files"),
        ({"subject": ["x"]}, "no file of a record"),
        ({"subject": [{"name": "../x", "digest": DIGEST}]}, "no file of a record"),
        ({"subject": [{"name": 1, "digest": DIGEST}]}, "no file of a record"),
        ({"subject": [{"name": "x", "digest": {"sha512": "00"}}]}, "no file of a record"),
        ({"subject": [{"name": "x", "digest": {"sha256": "0"}}]}, "no file of a record"),
        (
            {"subject": [{"name": "x", "digest": DIGEST}, {"name": "x", "digest": DIGEST}]},
            "no file of a record",
        ),
        ({"predicate": None}, "no run record of version 1: predicate:"),
        ({"predicate": {}}, "no run record of version 1: sequence: Field required"),
    ],
)
def test_other_statements_are_refused(data: dict[str, Any], change: dict[str, Any], said: str) -> None:
    """Each with what it is."""
    with pytest.raises(CouldNotCheck, match=said):
        parse(json.dumps({**data, **change}).encode())


@pytest.mark.parametrize("text", [b"", b"[]", b"\xff", b"1", b"[" * 100_000, b'{"a":' * 100_000])
def test_what_is_no_statement_is_refused(text: bytes) -> None:
    """Cut, of another kind, or nested without end."""
    with pytest.raises(CouldNotCheck, match=r"not JSON text|not a statement"):
        parse(text)


def nested(depth: int) -> Any:
    value: Any = 1
    for _ in range(depth):
        value = [value]
    return value


def test_nested_unknown_field_is_ignored(draft: MakeDraft, data: dict[str, Any]) -> None:
    """To a depth that somebody could have meant."""
    data["predicate"]["more"] = nested(50)
    assert parse(json.dumps(data).encode()).payload == draft().payload


def test_nesting_without_sense_is_no_crash(data: dict[str, Any]) -> None:
    """It ends in words, whichever reader gives up first."""
    data["predicate"]["more"] = nested(700)
    with pytest.raises(CouldNotCheck, match=r"recursion limit exceeded|nested too deeply"):
        parse(json.dumps(data).encode())
