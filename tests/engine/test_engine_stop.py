"""Ending a run from outside: at once where that is safe, never while sources go off."""

from __future__ import annotations

import json
import signal
from pathlib import Path

import pytest

from benchrun.engine.operators import Nobody, Person
from benchrun.engine.stopping import StopSignals
from benchrun.errors import InputError, Stopped
from benchrun.hookup import Connection, Hookup

HANGUP = getattr(signal, "SIGHUP", signal.SIGTERM)  # not everywhere
ENDINGS = pytest.mark.parametrize(
    ("number", "who"),
    [(signal.SIGINT, "the operator"), (signal.SIGTERM, "the system"), (HANGUP, "the system")],
)


@pytest.fixture(autouse=True)
def handlers():
    """Whatever a test does, the handlers of the test runner stand again afterwards."""
    before = {n: signal.getsignal(n) for n in (signal.SIGINT, signal.SIGTERM, HANGUP)}
    yield before
    for number, handler in before.items():
        signal.signal(number, handler)


def stopped(w, answer, reason):
    found = answer.document
    assert (answer.code, found["conclusion"], found["reason"]) == (4, "stopped", reason)
    assert w.analyzer.output is False
    assert "left_on" not in found
    (record,) = w.records
    assert w.audit(record).code == 0
    return record


@ENDINGS
@pytest.mark.parametrize("request_number", [1, 5, 8])
def test_a_stop_within_a_sweep(workplace, handlers, number, who, request_number):
    w = workplace(units=("HF-0001", "HF-0002"))
    w.mishaps.at("INIT;*OPC?", request_number, lambda: signal.raise_signal(number))
    answer = w.run()
    record = stopped(w, answer, f"{who} ended the run")
    assert len(list((record / "raw").iterdir() if (record / "raw").exists() else [])) == request_number - 1
    assert signal.getsignal(number) == handlers[number]
    journal = [json.loads(line)["event"] for line in (record / "journal.jsonl").read_text().splitlines()]
    assert journal[-2:] == ["safe", "run ended"]


def test_further_stops_while_making_safe_change_nothing(workplace):
    w = workplace()
    w.mishaps.at("INIT;*OPC?", 3, lambda: signal.raise_signal(signal.SIGINT))
    for number in (1, 1, 2):
        w.mishaps.at("OUTP OFF", number, lambda: signal.raise_signal(signal.SIGINT))
    w.mishaps.at("OUTP OFF", 1, lambda: signal.raise_signal(signal.SIGTERM))
    answer = w.run()
    stopped(w, answer, "the operator ended the run")
    last = w.mishaps.requests[next(i for i, r in enumerate(w.mishaps.requests) if "OUTP OFF" in r) :]
    assert {one.strip() for one in last} == {"OUTP OFF;*OPC?", "SYST:ERR?"}


def test_a_stop_after_the_last_step_ends_the_series_but_not_the_unit(workplace):
    w = workplace(units=("HF-0001", "HF-0002"))
    w.mishaps.at("OUTP OFF", 1, lambda: signal.raise_signal(signal.SIGINT))
    answer = w.run()
    assert (answer.code, answer.document["conclusion"]) == (0, "pass")
    assert answer.document["unit"] == "HF-0001"
    assert len(w.records) == 1


def test_a_stop_while_the_record_is_written(workplace):
    w = workplace(units=("HF-0001", "HF-0002"))

    def key(origin, made=w.job.signer):
        if any(event.name == "run ended" for event in w.events):
            signal.raise_signal(signal.SIGINT)
        return made(origin)

    w.run(signer=key)
    assert len(w.records) == 2
    for record in w.records:
        assert w.audit(record).code == 0


def test_a_stop_between_units_spares_the_next(workplace):
    w = workplace(units=("HF-0001", "HF-0002", "HF-9001"))
    w.mishaps.at("INIT;*OPC?", 9, lambda: signal.raise_signal(signal.SIGINT))  # the second unit's reading
    answer = w.run()
    assert [u["unit"] for u in answer.document["units"]] == ["HF-0001", "HF-0002"]
    assert [u["conclusion"] for u in answer.document["units"]] == ["pass", "stopped"]
    assert (answer.document["conclusion"], answer.code) == ("stopped", 4)
    for record in w.records:
        assert w.audit(record).code == 0


def test_what_the_caller_wants_ignored_stays_ignored(workplace):
    signal.signal(HANGUP, signal.SIG_IGN)  # as nohup leaves it
    w = workplace()
    w.mishaps.at("INIT;*OPC?", 3, lambda: signal.raise_signal(HANGUP))
    assert w.run().code == 0
    assert signal.getsignal(HANGUP) is signal.SIG_IGN


def test_a_stop_asked_for_outside_comes_through_at_the_next_armed_place():
    with StopSignals() as stop:
        signal.raise_signal(signal.SIGINT)
        assert stop.asked
        with pytest.raises(Stopped, match="the operator ended the run"), stop.armed():
            pytest.fail("nothing may begin any more")


def test_stop_is_no_exception_that_a_step_could_swallow():
    assert not issubclass(Stopped, Exception)


UNIT = Hookup((Connection(("unit-holder", "unit", "jig"), (1, 2)),))


def test_a_person_is_told_which_unit():
    asked = []

    def ask(request):
        asked.append(request)
        return "\n"

    person = Person(ask)
    person.check((UNIT, UNIT))
    person.offer("HF-0001")
    person.connect(UNIT)
    person.connect(Hookup.of("short", 1))
    assert asked == [
        "Connect unit-holder, unit HF-0001, jig from port 1 to port 2",
        "Connect short on port 1",
    ]


@pytest.mark.parametrize("word", ["stop", " STOP \n", "s", "q", "quit\n"])
def test_a_person_stops(word):
    with pytest.raises(Stopped, match="the operator ended the run"):
        Person(lambda _: word).connect(Hookup.of("short", 1))


@pytest.mark.parametrize("word", ["", "\n", "y\n", "OK", "done", "yes\r\n"])
def test_a_person_goes_on(word):
    Person(lambda _: word).connect(Hookup.of("short", 1))


def test_a_person_who_says_anything_else_is_asked_again():
    answers = iter(["no\n", "wait", "where is it?\n", "\n"])
    Person(lambda _: next(answers)).connect(Hookup.of("short", 1))
    assert list(answers) == []


def test_an_input_that_ends_stops():
    def ask(request):
        raise EOFError

    with pytest.raises(Stopped, match="nobody answered: the input ended"):
        Person(ask).connect(Hookup.of("short", 1))


def test_nobody_can_neither_connect_nor_change_the_unit():
    with pytest.raises(InputError, match=r"needs 2 different connections .* run it without --unattended"):
        Nobody().check((Hookup.of("short", 1), UNIT))
    nobody = Nobody()
    nobody.check((UNIT,))
    nobody.offer("HF-0001")
    nobody.offer("HF-0001")
    with pytest.raises(InputError, match=r"nobody is there to change it for HF-0002"):
        nobody.offer("HF-0002")


UNCORRECTED = """\
sequence: quick-look
edition: 1
title: Quick look, uncorrected
unit: {part: filter, serial: "HF-[0-9]{4}", withstands: {power: 30 dBm}}
sweeps:
  wide: {from: 5 MHz, to: 1.2 GHz, points: 61, spacing: log, bandwidth: 10 kHz, power: -10 dBm}
steps:
  - sweep: {as: seen, sweep: wide}
  - judge: {from: seen, limits: [{figure: insertion loss, over: 100 MHz to 150 MHz, at most: 6 dB}]}
"""


def test_unattended_units_are_refused_before_anything_is_sent(workplace):
    w = workplace(UNCORRECTED, units=("HF-0001", "HF-0002"))
    with pytest.raises(InputError, match="nobody is there to change it"):
        w.run(hands=Nobody())
    assert w.mishaps.requests == []
    assert not Path(w.job.records).exists()


def test_without_a_calibration_no_unit_inherits_figures(workplace):
    w = workplace(UNCORRECTED, units=("HF-0001", "HF-0002"))
    w.mishaps.twice("TRAC? MATRIX", 2, b"")
    units = w.run().document["units"]
    assert [(u["conclusion"], len(u["figures"])) for u in units] == [("pass", 1), ("invalid", 0)]
    for record in w.records:
        assert w.audit(record).code == 0
