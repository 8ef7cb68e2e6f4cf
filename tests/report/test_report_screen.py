"""What a person sees of a run, on any terminal, on none, and on one that goes away."""

from __future__ import annotations

import io
import json
import os
import re
from dataclasses import replace

import pytest

from benchrun.cli.main import Patient
from benchrun.clock import FunctionClock
from benchrun.engine import events
from benchrun.engine.emitter import Emitter
from benchrun.engine.run import Outcome, run
from benchrun.evaluate.judgement import JudgedFigure
from benchrun.report.document import document
from benchrun.report.screen import Screen
from benchrun.report.words import amount, duration, limit, outside
from benchrun.uncertainty.decision import Conclusion

FIGURE = JudgedFigure(
    name="return loss, 160 MHz to 175 MHz, port 1", value=11.597, unit="dB", limit=15.0, side="at least",
    margin=-3.403, uncertainty=0.549, at_hz=169143661.29, conclusion="fail",
)  # fmt: skip
LOSS = replace(FIGURE, value=0.5953, limit=0.6, side="at most", margin=0.0047, uncertainty=0.0756)


class Terminal(io.StringIO):
    """Somebody's terminal."""

    def isatty(self) -> bool:
        return True


def show(w, stream, **options):
    """Run, shown on a stream; gives the outcomes."""
    screen = Screen(stream, **options)
    outcomes = run(replace(w.job, sink=screen.show))
    for outcome in outcomes:
        screen.finish(outcome)
    return outcomes


@pytest.mark.parametrize("columns", [40, 80, 200])
def test_all_is_told_on_any_terminal(workplace, monkeypatch, columns):
    monkeypatch.setenv("COLUMNS", str(columns))
    monkeypatch.setenv("TERM", "xterm")
    w, stream = workplace(units=("HF-0001", "HF-9001")), Terminal()
    (_, bad) = show(w, stream)
    assert bad.conclusion is Conclusion.FAIL
    text = re.sub(r"\x1b\[[0-9;]*m", "", stream.getvalue())
    flowing = re.sub(r"\s+", "", text)
    for words in (
        "unit HF-9001, transmitter harmonic filter, 169 MHz",
        "rehearsal: simulated instruments, seed 1",
        "analyzer at GPIB0::16::INSTR: SIMULATED,NA-2,S0016,1.0",
        "connect thru from port 1 to port 2",
        "guard band, w = 1 U, k = 2 (ILAC-G8:09/2019, 4.2.2)",
        "HF-0001: pass, all 3 limits hold",
        "HF-9001: fail",
        "fail: return loss",
        "beyond at least 14 dB",
        "sources off",
        str(bad.record),
    ):
        assert words.replace(" ", "") in flowing, words
    assert "\x1b[3" not in stream.getvalue(), "weight and inversion carry the meaning, no colour does"
    if columns == 200:
        assert any(
            re.search(r"insertion loss, .* at most 0.6 dB .* pass", line) for line in text.splitlines()
        )


def test_without_a_terminal_there_are_no_control_characters(workplace):
    w, stream = workplace(), io.StringIO()
    show(w, stream)
    assert all(c.isprintable() or c == "\n" for c in stream.getvalue())
    assert max(map(len, stream.getvalue().splitlines())) <= 220


def test_cautions_are_said_once_for_a_series(workplace, small_filter):
    text = small_filter.replace("sweeps:", "cautions: [static-sensitive, keep the lid closed]\nsweeps:")
    w, stream = workplace(text, units=("HF-0001", "HF-0002")), io.StringIO()
    show(w, stream)
    assert stream.getvalue().count("wear the wrist strap") == 1
    assert stream.getvalue().count("keep the lid closed") == 1
    assert stream.getvalue().count("unit HF-000") == 2


def test_quiet_says_only_what_went_wrong(workplace):
    w, stream = workplace(units=("HF-0001", "HF-9001")), io.StringIO()
    show(w, stream, quiet=True)
    assert stream.getvalue() == ""
    lost = Outcome(
        "HF-1", Conclusion.INVALID, "no answer", "run again", left_on=("the source",), trouble="full"
    )
    screen = Screen(stream, quiet=True)
    screen.finish(lost)
    assert stream.getvalue() == "no answer\nrun again\nSTILL ON: the source\nfull\n"


def test_what_is_in_brackets_is_text_and_no_markup(workplace, small_filter):
    w = workplace(small_filter.replace("few points", "[bold]few[/bold] points [/red]"))
    stream = io.StringIO()
    show(w, stream)
    assert "Harmonic low-pass filter, [bold]few[/bold] points [/red] (small-filter)" in stream.getvalue()


class Broken(io.StringIO):
    """A screen that fails from a given write on."""

    def __init__(self, error, after):
        super().__init__()
        self.error, self.after = error, after

    def write(self, text):
        self.after -= 1
        if self.after < 0:
            raise self.error
        return super().write(text)


@pytest.mark.parametrize("after", [0, 1, 7])
@pytest.mark.parametrize(
    "error", [BrokenPipeError(32, "Broken pipe"), OSError(28, "No space left"), ValueError("closed file")]
)
def test_a_screen_that_breaks_never_breaks_a_run(workplace, error, after):
    w = workplace()
    screen = Screen(Broken(error, after))
    (outcome,) = run(replace(w.job, sink=screen.show))
    assert outcome.conclusion is Conclusion.PASS
    assert w.audit(outcome.record).code == 0
    journal = [json.loads(line) for line in (outcome.record / "journal.jsonl").read_text().splitlines()]
    assert journal[-1]["event"] == "run ended", "the journal has all that the screen lost"


def test_a_stop_from_a_screen_is_none_of_its_business():
    def sink(event):
        raise KeyboardInterrupt

    emit = Emitter(sink, FunctionClock(lambda: 0.0, lambda _: None))
    with pytest.raises(KeyboardInterrupt):
        emit(events.Noted(text="x"))


def test_a_pipe_whose_reader_went_away_swallows_the_rest():
    reading, writing = os.pipe()
    os.close(reading)
    with os.fdopen(writing, "w") as stream:
        patient = Patient(stream)
        assert patient.write("x" * 100_000) == 100_000
        patient.flush()
        assert patient.write("more") == 4
        patient.flush()
        assert patient.fileno() == writing


def test_events_carry_bench_time_and_become_plain_data():
    now = [10.0]
    seen: list = []
    emit = Emitter(seen.append, FunctionClock(lambda: now[0], lambda _: None))
    now[0] = 12.5
    emit(events.FigureJudged(figure=FIGURE))
    assert seen[0].at_s == emit.seconds() == 2.5
    (line,) = emit.as_json_lines().decode().splitlines()
    found = json.loads(line)
    assert (found["event"], found["figure"]["name"]) == ("figure", FIGURE.name)


def test_amounts():
    assert amount(None, "dB") == amount(float("nan"), "dB") == amount(float("inf"), "Hz") == "none"
    assert [amount(1.25, "1"), amount(-0.004, "dB"), amount(200585288.7, "Hz"), amount(1.27e-9, "s")] == [
        "1.25", "-0.00 dB", "200.6 MHz", "1.27 ns",
    ]  # fmt: skip
    assert [limit(LOSS), limit(replace(FIGURE, unit="1", limit=1.5, side="at most"))] == [
        "at most 0.6 dB", "at most 1.5",
    ]  # fmt: skip
    assert limit(replace(FIGURE, unit="Hz", limit=195e6)) == "at least 195 MHz"


def test_durations():
    assert [duration(s) for s in (0.0, 59.94, 60.0, 119.6, 3599.0, 3600.0, 7300.0)] == [
        "0.0 s", "59.9 s", "1 min 0 s", "2 min 0 s", "59 min 59 s", "1 h 0 min", "2 h 1 min",
    ]  # fmt: skip
    assert duration(59.97) == "1 min 0 s"
    assert duration(3599.7) == "1 h 0 min"


def test_what_is_outside_says_where_and_by_how_much():
    assert outside(FIGURE) == (
        "return loss, 160 MHz to 175 MHz, port 1 is 11.597 dB at 169.1 MHz, 3.403 dB beyond at least 15 dB"
    )
    assert outside(LOSS).endswith("only 0.005 dB inside at most 0.6 dB with U = 0.076 dB")
    missing = replace(FIGURE, value=None, margin=None, at_hz=None, remark="not found: no corner")
    assert outside(missing) == "return loss, 160 MHz to 175 MHz, port 1: not found: no corner"


def test_document_of_one_and_of_several():
    one = Outcome("HF-1", Conclusion.FAIL, figures=(FIGURE,), origin="measured")
    two = Outcome("HF-2", Conclusion.STOPPED, "the operator ended the run", left_on=("a source",))
    found = json.loads(document([one]))
    assert list(found) == ["conclusion", "record", "unit", "simulated", "figures"]
    assert (found["record"], found["simulated"]) == (None, False)
    both = json.loads(document([one, two]))
    assert (both["conclusion"], len(both["units"])) == ("stopped", 2)
    assert both["units"][0] == found
    assert both["units"][1]["left_on"] == ["a source"]
    assert both["units"][1]["reason"] == "the operator ended the run"
