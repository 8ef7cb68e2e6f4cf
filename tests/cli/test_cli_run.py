"""``benchrun run`` and ``rehearse`` as a technician uses them: prompts, documents, keys, exit codes."""

from __future__ import annotations

import io
import json
import subprocess
import sys
from pathlib import Path

import pytest

from benchrun.paths import installed_sequences
from benchrun.record.keys import KeyStore
from sim_instruments.bench import load_bench
from sim_instruments.doors.socket import SocketDoor

KEYS = {"conclusion", "record", "unit", "simulated", "figures"}
FIGURE_KEYS = ["name", "value", "unit", "limit", "margin", "uncertainty", "at_hz", "conclusion"]
BENCH = (installed_sequences() / "benches/workshop.yaml").read_text()


class Typist(io.StringIO):
    """Standard input of somebody who does what the screen asks, before pressing Enter."""

    def __init__(self, world, serial, capsys, lines=None):
        super().__init__()
        self.world, self.serial, self.capsys, self.lines = world, serial, capsys, lines
        self.seen = []

    def readline(self, size=-1):
        said = self.capsys.readouterr()
        self.seen.append(said.err.splitlines()[-1])
        if self.lines is not None and len(self.seen) > len(self.lines):
            return ""
        words = self.seen[-1].removeprefix("  Connect ").partition(", then Enter")[0]
        chain, _, ports = words.replace(f"unit {self.serial}", "unit").partition(
            " from " if " from " in words else " on "
        )
        numbers = tuple(int(word) for word in ports.split() if word.isdigit())
        self.world.offer(self.serial)
        self.world.connect([(tuple(chain.split(", ")), numbers)])
        return "\n" if self.lines is None else self.lines[len(self.seen) - 1]


@pytest.fixture
def door(tmp_path, monkeypatch, capsys):
    """A bench file of a real kind, whose analyzer stands behind a socket; and who answers the prompts."""
    bench = load_bench("workshop", 3)
    instrument = bench.instruments["GPIB0::16::INSTR"]
    with SocketDoor(instrument) as door:
        text = BENCH.replace("GPIB0::16::INSTR", f'{door.resource}\n    library: "@py"')
        (tmp_path / "bench.yaml").write_text(text)
        typist = Typist(bench.world, "HF-0001", capsys)
        monkeypatch.setattr(sys, "stdin", typist)
        yield instrument, typist


RUN = ("run", "filter.yaml", "--bench", "bench.yaml", "--unit", "HF-0001", "--records", "R")


def test_run_over_a_real_line(cli, door):
    instrument, typist = door
    answer = cli(*RUN, "--json")
    assert answer.code == 0, answer.err
    assert answer.document["conclusion"] == "pass"
    assert answer.document["simulated"] is True
    assert [s.removeprefix("  Connect ").removesuffix(", then Enter (or: stop) ") for s in typist.seen] == [
        "short on port 1", "open on port 1", "load on port 1",
        "short on port 2", "open on port 2", "load on port 2",
        "thru from port 1 to port 2", "jig-left, unit HF-0001, jig-right from port 1 to port 2",
    ]  # fmt: skip
    assert instrument.output is False
    audit = cli("audit", answer.document["record"])
    assert audit.code == 0, audit.err
    assert "rehearsal key" in audit.out
    assert "origin: simulated" in audit.out
    assert [info.purpose for info in KeyStore().list()] == ["rehearsal"]


@pytest.mark.parametrize("number", [1, 8])
def test_stop_at_a_prompt(cli, door, number):
    instrument, typist = door
    typist.lines = ["\n"] * (number - 1) + ["stop\n"]
    answer = cli(*RUN, "--json")
    assert (answer.code, answer.document["conclusion"]) == (4, "stopped")
    assert answer.document["reason"] == "the operator ended the run"
    assert instrument.output is False
    assert cli("audit", answer.document["record"]).code == 0
    assert len(typist.seen) == number


def test_end_of_input_at_a_prompt(cli, door):
    instrument, typist = door
    typist.lines = ["\n", "\n"]
    answer = cli(*RUN)
    assert answer.code == 4
    assert "nobody answered: the input ended" in answer.out + answer.err
    assert instrument.output is False
    (record,) = Path("R").iterdir()
    assert cli("audit", str(record)).code == 0


def test_a_measured_run_without_a_key_sets_nothing(cli, door, tmp_path):
    instrument, typist = door
    instrument.identity = ("ACME", "NA-2", "S0016", "1.0")  # does not own up to a simulation
    instrument.output, instrument.averages = True, 77
    answer = cli(*RUN)
    assert answer.code == 2
    assert "there is no key to sign measured runs with in" in answer.err
    assert "benchrun keys make NAME" in answer.err
    assert typist.seen == []
    assert (instrument.output, instrument.averages) == (True, 77), "as it was found"
    assert list((tmp_path / "R").iterdir()) == []


def test_a_measured_run_is_signed_by_its_own_key(cli, door):
    instrument, _ = door
    instrument.identity = ("ACME", "NA-2", "S0016", "1.0")
    assert cli("keys", "make", "bench-1").code == 0
    assert cli("keys", "make", "bench-2").code == 0
    unclear = cli(*RUN)
    assert unclear.code == 2
    assert "there are 2 keys (bench-1, bench-2); say which one signs" in unclear.err
    answer = cli(*RUN, "--key", "bench-2", "--json")
    assert (answer.code, answer.document["simulated"]) == (0, False)
    audit = cli("audit", answer.document["record"])
    assert audit.code == 0
    assert "origin: measured" in audit.out
    assert "signed by bench-2 (bench key" in audit.out


def test_nothing_listens(cli, tmp_path):
    with SocketDoor(load_bench("workshop", 3).instruments["GPIB0::16::INSTR"]) as door:
        resource = door.resource
    (tmp_path / "bench.yaml").write_text(BENCH.replace("GPIB0::16::INSTR", f'{resource}\n    library: "@py"'))
    assert cli("keys", "make", "bench-1").code == 0
    answer = cli(*RUN, "--json")
    assert (answer.code, answer.document["conclusion"]) == (3, "invalid")
    assert f"{resource}: refuses the connection" in answer.document["reason"]
    assert "left_on" not in answer.document
    assert cli("audit", answer.document["record"]).code == 0
    asked = cli("bench", "bench.yaml")
    assert asked.code == 3
    assert "refuses the connection" in asked.err


def test_no_visa_library(cli, tmp_path):
    (tmp_path / "bench.yaml").write_text(
        BENCH.replace("GPIB0::16::INSTR", 'GPIB0::16::INSTR\n    library: "/nowhere/libvisa.so"')
    )
    assert cli("keys", "make", "bench-1").code == 0
    answer = cli(*RUN)
    assert answer.code == 3
    assert "there is no VISA library /nowhere/libvisa.so on this machine" in answer.out
    assert 'library: "@py"' in answer.out
    assert "sources off" not in answer.out, "nobody can say so of a bench that was never opened"


def test_one_document_and_nothing_else(cli):
    answer = cli("rehearse", "filter.yaml", "--records", "R", "--json", "--unit", "HF-0001")
    assert (answer.code, answer.err) == (0, "")
    assert answer.out.count("\n") == 1
    found = answer.document
    assert set(found) == KEYS
    assert (found["conclusion"], found["unit"], found["simulated"]) == ("pass", "HF-0001", True)
    assert Path(found["record"]).is_dir()
    assert [list(figure) for figure in found["figures"]] == [FIGURE_KEYS] * 3
    for figure in found["figures"]:
        inside = figure["limit"] - figure["value"]
        assert abs(figure["margin"]) == pytest.approx(abs(inside), rel=1e-12)
        assert figure["uncertainty"] > 0
        assert figure["unit"] == "dB"


def test_several_units_in_one_document(cli):
    answer = cli(
        "rehearse", "filter.yaml", "--records", "R", "--json", "--unit", "HF-0001", "--unit", "HF-9002"
    )
    found = answer.document
    assert (answer.code, found["conclusion"]) == (1, "fail")
    assert [(u["unit"], u["conclusion"]) for u in found["units"]] == [
        ("HF-0001", "pass"),
        ("HF-9002", "fail"),
    ]
    assert all(set(u) == KEYS for u in found["units"])


def test_a_bad_unit_says_which_limit_where_and_by_how_much(cli):
    answer = cli("rehearse", "harmonic-filter", "--unit", "HF-9001", "--records", "R")
    assert answer.code == 1
    assert "HF-9001: fail\n" in answer.out
    line = next(
        line
        for line in answer.out.splitlines()
        if line.startswith("  fail: return loss") and "port 1" in line
    )
    assert " dB at 169.1 MHz, 3.4" in line
    assert line.endswith(" dB beyond at least 15 dB")
    assert answer.err == ""


def test_an_installed_name_and_the_first_known_unit(cli, tmp_path):
    answer = cli("rehearse", "harmonic-filter", "--json")
    assert answer.document["unit"] == "HF-0001"
    assert Path(answer.document["record"]).parent == Path("records")
    assert (tmp_path / "records").is_dir()


def test_bench_asks_who_is_there(cli):
    for name, model in (("workshop", "NA-2,S0016"), ("workshop-second", "NA-1,S0017")):
        answer = cli("bench", name, "--simulated")
        assert (answer.code, answer.err) == (0, "")
        assert f"SIMULATED,{model},1.0 (simulated)" in answer.out
        assert answer.out.endswith("no errors, no overload, reference locked; source off\n")


@pytest.mark.slow
@pytest.mark.parametrize("more", [(), ("--json",)])
def test_a_reader_that_goes_away_takes_nothing_with_it(cli, tmp_path, more):
    """``benchrun ... | head -1``: the run, its record and its exit code are those of any other."""
    child = subprocess.Popen(
        [sys.executable, "-c", "from benchrun.cli.main import main; main()", "rehearse", "filter.yaml",
         "--unit", "HF-9002", "--records", "R", *more],
        stdout=subprocess.PIPE, stderr=subprocess.PIPE,
    )  # fmt: skip
    child.stdout.close()
    err = child.stderr.read()
    child.stderr.close()
    assert (child.wait(), err) == (1, b"")
    (record,) = (tmp_path / "R").iterdir()
    assert json.loads((record / "envelope.json").read_text())["payload"]


@pytest.mark.slow
def test_closed_standard_streams(cli, tmp_path):
    done = subprocess.run(
        f"exec {sys.executable} -c 'from benchrun.cli.main import main; main()' rehearse filter.yaml "
        "--unit HF-9002 --records R >&- 2>&- <&-", shell=True, check=False,
    )  # fmt: skip
    assert done.returncode == 1
    assert len(list((tmp_path / "R").iterdir())) == 1
