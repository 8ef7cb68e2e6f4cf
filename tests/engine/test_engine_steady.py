"""After a fault of the line a whole new sweep is read, once, from the same instrument; and that is told."""

from __future__ import annotations

import base64
import json

import pytest

from sim_instruments.scpi.errors import ScpiError


def predicate(record):
    text = json.loads((record / "envelope.json").read_text())["payload"]
    return json.loads(base64.b64decode(text))["predicate"]


FAULTS = {
    "nothing": ("TRAC? MATRIX", b"", "gave no whole answer"),
    "a cut block": ("TRAC? MATRIX", b"#43904" + b"x" * 100 + b"\n", "ended its answer after"),
    "no end of the sweep": ("INIT;*OPC?", b"", "gave no whole answer"),
    "no grid": ("TRAC? GRID", b"", "gave no whole answer"),
}


@pytest.mark.parametrize("what", list(FAULTS))
@pytest.mark.parametrize("number", [1, 6, 8])
def test_a_broken_answer_is_read_again_as_a_new_sweep(workplace, what, number):
    request, data, words = FAULTS[what]
    w = workplace()
    w.mishaps.answer(request, number, data)
    answer = w.run()
    assert (answer.code, answer.document["conclusion"]) == (0, "pass")
    (record,) = w.records
    found = predicate(record)
    (again,) = found["repeated"]
    assert again.startswith("swept again: GPIB0::16::INSTR")
    assert words in again
    assert len(found["readings"]) == 8
    assert sum(one.startswith("INIT") for one in w.mishaps.requests) == 9
    assert w.audit(record).code == 0
    assert again in (record / "journal.jsonl").read_text()
    assert w.analyzer.output is False


def test_a_set_up_that_was_not_answered_is_made_again(workplace):
    w = workplace()
    w.mishaps.answer("SENS:SWE:POIN 61", 1, b"")
    assert w.run().code == 0
    assert predicate(w.records[0])["repeated"][0].startswith("set up again: ")


def test_a_line_that_was_lost_is_made_anew_and_the_instrument_asked_who_it_is(workplace):
    w = workplace()

    def drop():
        w.analyzer.line_closed = True

    library, opened = w.rehearsal.library, w.rehearsal.library.open

    def reopen(*arguments, **named):
        w.analyzer.line_closed = False
        return opened(*arguments, **named)

    w.mishaps.at("TRAC? MATRIX", 5, drop)
    library.open = reopen
    assert w.run().code == 0
    assert len(predicate(w.records[0])["repeated"]) == 1
    lost = next(i for i, r in enumerate(w.mishaps.requests) if w.mishaps.requests[:i].count(r) == 4
                and r.startswith("TRAC? MATRIX"))  # fmt: skip
    assert w.mishaps.requests[lost + 1].startswith("*IDN?")
    assert "*RST" in "".join(w.mishaps.requests[lost + 2 : lost + 5])


def test_another_instrument_after_a_lost_line_ends_the_run(workplace):
    w = workplace()
    w.mishaps.answer("TRAC? MATRIX", 5, b"")
    w.mishaps.answer("*IDN?", 2, b"SIMULATED,NA-2,S9999,1.0\n")
    answer = w.run()
    assert (answer.code, answer.document["conclusion"]) == (3, "invalid")
    assert "was 'SIMULATED,NA-2,S0016,1.0' at the start and is 'SIMULATED,NA-2,S9999,1.0'" in answer.err
    assert w.analyzer.output is False


@pytest.mark.parametrize("number", [-240, -310])
def test_what_the_instrument_complains_of_is_not_repeated_away(workplace, number):
    w = workplace()
    w.mishaps.at("TRAC? MATRIX", 5, lambda: w.analyzer.status.report(ScpiError(number)))
    w.mishaps.answer("TRAC? MATRIX", 5, b"")
    answer = w.run()
    assert (answer.code, answer.document["conclusion"]) == (3, "invalid")
    assert str(number) in answer.document["reason"]


def test_a_second_fault_of_the_same_reading_ends_the_run_with_the_second_reason(workplace):
    w = workplace()
    w.mishaps.answer("TRAC? MATRIX", 5, b"#43904" + b"x" * 100 + b"\n")
    w.mishaps.answer("TRAC? MATRIX", 6, b"")
    answer = w.run()
    assert (answer.code, answer.document["conclusion"]) == (3, "invalid")
    assert "gave no whole answer" in answer.document["reason"]
    assert predicate(w.records[0])["repeated"]


def test_text_where_a_block_was_due_is_no_fault_of_the_line(workplace):
    w = workplace()
    w.mishaps.answer("TRAC? MATRIX", 5, b"BUSY\n")
    answer = w.run()
    assert (answer.code, predicate(w.records[0])["repeated"]) == (3, [])


def test_a_quiet_run_repeats_nothing(workplace):
    w = workplace()
    w.run()
    assert predicate(w.records[0])["repeated"] == []
