"""What a payload accepts when written, and when read."""

from __future__ import annotations

import json
import math
from collections.abc import Callable
from dataclasses import replace
from datetime import UTC, datetime, timedelta, timezone
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st
from pydantic import ValidationError

from benchrun.evaluate.judgement import JudgedFigure
from benchrun.record.draft import Draft
from benchrun.record.payload import InstrumentEntry, Payload, UnitEntry, check_path, safe_name, utc_text

MakeDraft = Callable[..., Draft]


def plain(payload: Payload) -> dict[str, Any]:
    data: dict[str, Any] = json.loads(json.dumps(payload.model_dump(mode="json")))
    return data


def test_payload_is_read_back_exactly(draft: MakeDraft) -> None:
    """Through plain data, floats and figures included."""
    payload = draft(bench_seconds=0.1 + 0.2).payload
    assert Payload.from_data(plain(payload)) == payload
    assert isinstance(Payload.from_data(plain(payload)).figures[0], JudgedFigure)


def test_unknown_keys_are_ignored_when_read(draft: MakeDraft) -> None:
    """At every depth: a later benchrun may add to version 1 (in-toto Statement v1, parsing rules)."""
    payload = draft().payload
    data = plain(payload)
    data["weather"] = {"inside": "dry"}
    data["unit"]["colour"] = "grey"
    data["figures"][0]["comment"] = [1]
    data["readings"][0]["comment"] = None
    assert Payload.from_data(data) == payload


def test_unknown_keys_are_refused_when_written(draft: MakeDraft) -> None:
    """A typing error in the program does not get into a signed record."""
    with pytest.raises(ValidationError, match="operater"):
        draft(operater="x")
    with pytest.raises(ValidationError, match="serail"):
        UnitEntry(serial="1", part="x", serail="1")  # type: ignore[call-arg]


@pytest.mark.parametrize(
    ("key", "value"),
    [
        ("conclusion", "good"),
        ("origin", "real"),
        ("seed", "7"),
        ("bench_seconds", math.nan),
        ("bench_seconds", "1"),
        ("started_utc", "2026-03-01 12:00"),
        ("started_utc", "2026-03-01T12:00:00+01:00"),
        ("inputs", {"sequence": "../sequence.yaml"}),
        ("inputs", {"sequence": "/sequence.yaml"}),
    ],
)
def test_wrong_values_are_refused(draft: MakeDraft, key: str, value: object) -> None:
    """Both when written and when read."""
    with pytest.raises(ValidationError, match=key):
        draft(**{key: value})
    with pytest.raises(ValidationError, match=key):
        Payload.from_data({**plain(draft().payload), key: value})


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
def test_figure_must_be_a_number(draft: MakeDraft, figure: JudgedFigure, value: float) -> None:
    """JSON has no word for it, and nobody could judge it."""
    with pytest.raises(ValidationError, match="finite number"):
        draft(figures=(replace(figure, value=value),))


@pytest.mark.parametrize("origin", ["simulated", "recorded"])
def test_run_with_a_simulated_instrument_cannot_count_as_measured(draft: MakeDraft, origin: str) -> None:
    """What the instruments say about themselves rules."""
    instrument = InstrumentEntry(role="analyzer", resource="A", identity="a", origin=origin)  # type: ignore[arg-type]
    with pytest.raises(ValidationError, match="cannot count as measured: analyzer is not a real instrument"):
        draft(origin="measured", instruments=(instrument,))


def test_payload_cannot_be_changed(draft: MakeDraft) -> None:
    """What was checked is what is signed."""
    with pytest.raises(ValidationError, match="frozen"):
        draft().payload.conclusion = "fail"  # type: ignore[misc]


def test_time_is_utc() -> None:
    """Whatever zone it came in; without one it is refused."""
    there = datetime(2026, 3, 1, 13, 0, tzinfo=timezone(timedelta(hours=1)))
    assert utc_text(there) == "2026-03-01T12:00:00.000Z"
    assert utc_text(datetime(2026, 3, 1, 12, tzinfo=UTC)) == utc_text(there)
    with pytest.raises(ValueError, match="no time zone"):
        utc_text(datetime(2026, 3, 1, 12))


@given(st.text())
def test_safe_name_is_always_a_path(text: str) -> None:
    """Whatever a hook-up, a serial number or a file is called."""
    name = safe_name(text)
    assert check_path(name) == name
    assert safe_name(name) == name


def test_safe_name_keeps_good_names() -> None:
    """And avoids names that Windows keeps for devices."""
    assert safe_name("jig-left.s2p") == "jig-left.s2p"
    assert safe_name("COM1.s2p") == "x-COM1.s2p"
    assert safe_name("Ω / 50") == "50"
