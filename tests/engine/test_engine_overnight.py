"""A night: every job gets its turn, one failing stops no other, and a broken night goes on where it was."""

from __future__ import annotations

import json
import os
import signal
from pathlib import Path

import pytest

from benchrun.engine.journal import Journal
from benchrun.engine.nightworker import carry_out
from benchrun.engine.overnight import Settings, Worker, code_of, overnight
from benchrun.errors import InputError
from benchrun.report.night import night_document, suites
from benchrun.sequence.files import load_model, read
from benchrun.sequence.night import Night

NIGHT = """\
night: first
edition: 1
title: A first night
workers: 2
jobs:
  - {job: filters, sequence: filter.yaml, bench: workshop, units: [HF-0001], repeats: 3, rehearsal: {seed: 5}}
  - {job: pads, sequence: pad-10db, rehearsal: {}}
"""


class Process:
    def wait(self):
        return -9


class Fake(Worker):
    """A worker in this process: it answers by a function, at once or when it is told to stop."""

    def __init__(self, said, answer):
        self.said, self.answer = said, answer
        self.task, self.begun, self.told_to_stop, self.process = None, 0.0, 0.0, Process()
        self.given, self.ended = [], False

    def give(self, task):
        self.task = task
        task.attempts += 1
        self.given.append(task)
        answer = self.answer(task)
        self.said.put((self, None if answer is None else json.dumps(answer)))

    def stop(self):
        self.told_to_stop = 1.0

    def end(self):
        self.ended = True


def came_to(conclusion="pass", code=0):
    def answer(task):
        unit = {
            "unit": "HF-0001", "conclusion": conclusion, "reason": "", "trouble": "", "left_on": [],
            "record": "r", "code": code, "figures": [],
        }  # fmt: skip
        return {"label": task.order["label"], "seconds": 1.0, "units": [unit]}

    return answer


@pytest.fixture
def place(tmp_path, small_filter, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "filter.yaml").write_text(small_filter)
    (tmp_path / "night.yaml").write_text(NIGHT)
    return tmp_path


def work(place, answer, text=NIGHT, **settings):
    made, told = [], []

    def worker(said):
        made.append(Fake(said, answer))
        return made[-1]

    (place / "night.yaml").write_text(text)
    night = read(place / "night.yaml", Night)
    found = Settings(place / "records", "tester", progress=told.append, **settings)
    return overnight(night, found, worker), told, made


def labels(made):
    return sorted(task.order["label"] for worker in made for task in worker.given)


def test_every_job_gets_its_turn(place):
    result, told, made = work(place, came_to())
    assert labels(made) == ["first/filters/1", "first/filters/2", "first/filters/3", "first/pads/1"]
    assert result.exit_code == 0
    assert {job: len(found) for job, found in result.answers.items()} == {"filters": 3, "pads": 1}
    assert [event["done"] for event in told] == [1, 2, 3, 4]
    assert all(worker.ended for worker in made)
    assert list((place / "records").iterdir()) == []
    seeds = {task.order["label"]: task.order["seed"] for w in made for task in w.given}
    assert seeds == {"first/filters/1": 5, "first/filters/2": 6, "first/filters/3": 7, "first/pads/1": 1}


def test_a_real_bench_is_never_given_to_two_at_once(place):
    text = NIGHT.replace(", rehearsal: {seed: 5}", "").replace("pad-10db, rehearsal: {}", "filter.yaml, "
                         "bench: workshop, units: [HF-0002]")  # fmt: skip
    lanes = []

    def answer(task):
        lanes.append(task.lane)
        return came_to()(task)

    _, _, made = work(place, answer, text)
    assert len(made) == 1, "a second worker would have nothing to do"
    assert len(set(lanes)) == 1


@pytest.mark.parametrize(("conclusion", "code"), [("fail", 1), ("invalid", 3), ("stopped", 4)])
def test_one_failing_stops_no_other_and_decides_the_exit_code(place, conclusion, code):
    def answer(task):
        bad = task.order["label"] == "first/filters/1"
        return came_to(conclusion, code)(task) if bad else came_to()(task)

    result, told, _ = work(place, answer)
    assert result.exit_code == code
    assert len(told) == 4


def test_failures_in_a_row_end_their_job_only(place):
    text = NIGHT.replace("workers: 2", "workers: 1\nlimits: {failures in a row: 2}")
    bad, good = came_to("fail", 1), came_to()
    result, _, made = work(place, lambda t: bad(t) if t.job == "filters" else good(t), text)
    assert labels(made) == ["first/filters/1", "first/filters/2", "first/pads/1"]
    assert result.answers["filters"][2]["trouble"] == "not run: 2 failures in a row"
    assert result.exit_code == 4


def test_a_process_that_dies_is_replaced_and_its_task_tried_once_more(place):
    tries = []

    def answer(task):
        tries.append(task.order["label"])
        return None if task.order["label"] == "first/pads/1" else came_to()(task)

    result, _, _ = work(place, answer)
    assert tries.count("first/pads/1") == 2
    (pads,) = result.answers["pads"]
    assert (pads["trouble"], code_of(pads)) == ("its process ended by itself with code -9, twice", 3)
    assert code_of(result.answers["filters"][0]) == 0


def test_a_night_whose_time_is_over_leaves_the_rest(place):
    text = NIGHT.replace("workers: 2", "workers: 1\nlimits: {time: 1 ns}")
    result, _, made = work(place, came_to(), text)
    assert labels(made) == []
    assert result.answers["pads"][0]["trouble"] == "not run: the night's time was over"
    assert result.exit_code == 4


def test_a_night_that_was_stopped_goes_on_where_it_was(place):
    count = []

    def answer(task):
        count.append(task.order["label"])
        if len(count) == 2:
            os.kill(os.getpid(), signal.SIGTERM)
        return came_to()(task)

    text = NIGHT.replace("workers: 2", "workers: 1")
    result, _, _ = work(place, answer, text)
    assert (count, result.exit_code) == (["first/filters/1", "first/filters/2"], 4)
    assert result.answers["pads"][0]["trouble"] == "not run: the night was stopped"
    assert [path.name for path in (place / "records").iterdir()] == [".first.night"]
    result, told, made = work(place, came_to(), text)
    assert labels(made) == ["first/filters/3", "first/pads/1"]
    assert (result.exit_code, len(result.answers["filters"])) == (0, 3)
    assert told[-1]["done"] == 4
    assert list((place / "records").iterdir()) == []


def test_a_changed_file_is_another_night(place):
    (place / "records").mkdir()
    journal = Journal(place / "records" / ".first.night")
    journal.line("begun", digest="another")
    journal.close()
    with pytest.raises(
        InputError, match=r"night.yaml:1:\d+: the file was changed .* begin anew with --afresh"
    ):
        work(place, came_to())
    result, _, _ = work(place, came_to(), afresh=True)
    assert result.exit_code == 0


def test_two_nights_of_one_name_do_not_run_at_once(place):
    (place / "records").mkdir()
    journal = Journal(place / "records" / ".first.night")
    journal.line("begun", digest="x")
    with pytest.raises(InputError, match="is still going"):
        work(place, came_to())
    journal.close()


MISTAKES = {
    "no bench": ("rehearsal: {seed: 5}", "", "bench: workshop, ", "", "needs a bench"),
    "no units": (", rehearsal: {seed: 5}", "", ", units: [HF-0001]", "", "needs units"),
    "both": ("units: [HF-0001]", "units: [A], population: {serial: 'A{:d}', from: 1, to: 2}", "", "",
             "units or a population, not both"),
    "no place": ("units: [HF-0001]", "population: {serial: A, from: 1, to: 2}", "", "", "needs one place"),
    "a way out": ("units: [HF-0001]", "population: {serial: '{0.__class__}', from: 1, to: 2}", "", "",
                  "needs one place"),
    "backwards": ("units: [HF-0001]", "population: {serial: 'A{:d}', from: 3, to: 2}", "", "",
                  "are not 1 to 100000 units"),
    "twice": ("job: pads", "job: filters", "", "", "two jobs are called 'filters'"),
    "no repeats": ("repeats: 3", "repeats: 0", "", "", "repeats"),
    "typo": ("repeats: 3", "repeat: 3", "", "", "Did you mean 'repeats'?"),
}  # fmt: skip


@pytest.mark.parametrize("what", list(MISTAKES))
def test_a_mistake_in_the_file_is_told_at_its_place(what):
    old, new, other, replacement, words = MISTAKES[what]
    text = NIGHT.replace(old, new).replace(other, replacement) if other else NIGHT.replace(old, new)
    with pytest.raises(InputError, match=words) as error:
        load_model(text.encode(), "night.yaml", Night)
    assert "night.yaml:" in str(error.value)


def test_a_population_has_its_serial_numbers():
    text = NIGHT.replace("units: [HF-0001]", "population: {serial: 'HF-{:04d}', from: 8, to: 11}")
    job = load_model(text.encode(), "night.yaml", Night).model.jobs[0]
    assert job.serials == ("HF-0008", "HF-0009", "HF-0010", "HF-0011")


def order(place, **changes):
    found = {
        "label": "n/j/1", "sequence": str(place / "filter.yaml"), "bench": "workshop", "units": ["HF-0001"],
        "records": str(place / "records"), "key": "", "seed": 1, "operator": "tester",
    }  # fmt: skip
    return {**found, **changes}


def test_a_worker_runs_a_task_and_answers_in_plain_data(place):
    answer = json.loads(json.dumps(carry_out(order(place, units=["HF-0001", "HF-9001"]))))
    assert [(u["unit"], u["conclusion"], u["code"]) for u in answer["units"]] == [
        ("HF-0001", "pass", 0),
        ("HF-9001", "fail", 1),
    ]
    assert code_of(answer) == 1
    assert all(Path(u["record"]).is_dir() for u in answer["units"])


def test_a_worker_takes_the_first_unit_where_none_is_named(place):
    assert carry_out(order(place, units=[]))["units"][0]["unit"] == "HF-0001"


def test_a_worker_says_what_went_wrong(place):
    answer = carry_out(order(place, units=["XX"]))
    assert (answer["code"], answer["units"]) == (2, [])
    assert "does not match the pattern" in answer["trouble"]
    answer = carry_out(order(place, seed=None, bench="workshop"))
    assert answer["code"] == 2
    assert "nobody is there to make them" in answer["trouble"]
    answer = carry_out(order(place, units=5))
    assert answer["trouble"].startswith("a fault of the program: ")


def test_a_night_in_a_document_and_in_suites(place):
    def answer(task):
        number = task.order["label"]
        if number == "first/filters/2":
            return {"label": number, "seconds": 0.5, "units": [], "trouble": "no such file", "code": 2}
        return carry_out(order(place, label=number, units=["HF-9001"]))

    result, _, _ = work(place, answer)
    document = night_document(result)
    assert (document["exit_code"], document["conclusions"], document["without_conclusion"]) == (
        2,
        {"fail": 3},
        1,
    )
    filters, pads = suites(result)
    assert [case.result for case in filters.cases] == ["failure", "error", "failure"]
    assert [case.name for case in filters.cases] == ["HF-9001, run 1", "run 2", "HF-9001, run 3"]
    assert "fail: return loss, 160 MHz to 175 MHz, port 1 is " in pads.cases[0].text
    assert filters.cases[1].text == "no such file"
