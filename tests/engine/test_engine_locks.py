"""An instrument belongs to one run at a time; whoever died holds nothing."""

from __future__ import annotations

import json
import os
import re
import subprocess
import sys

import pytest

from benchrun.engine.locks import Busy, take
from benchrun.errors import BenchError

HOLD = """
import sys
from pathlib import Path
from benchrun.engine.locks import take
held = take(("GPIB0::16::INSTR",), "anna", "harmonic-filter on workshop", Path(sys.argv[1]))
print("held", flush=True)
sys.stdin.read()
import os
os._exit(0)  # without letting go, as a process that was killed
"""


def test_two_runs_in_one_process_do_not_share(tmp_path):
    held = take(("GPIB0::16::INSTR",), "anna", "first", tmp_path)
    with pytest.raises(Busy, match=r"GPIB0::16::INSTR is held by anna, first, since 20\d\d-.*process \d+"):
        take(("GPIB0::17::INSTR", "GPIB0::16::INSTR"), "bert", "second", tmp_path)
    take(("GPIB0::17::INSTR",), "bert", "third", tmp_path).release()  # nothing stayed half taken
    held.release()
    held.release()
    take(("GPIB0::16::INSTR",), "bert", "second", tmp_path).release()


@pytest.mark.parametrize("spelling", ["gpib0::16::instr", "GPIB::16", "GPIB0::16"])
def test_spellings_of_one_resource_are_one(tmp_path, spelling):
    held = take((spelling,), "anna", "first", tmp_path)
    with pytest.raises(Busy):
        take(("GPIB0::16::INSTR",), "bert", "second", tmp_path)
    held.release()


def test_another_process_holds_and_its_death_is_noticed(tmp_path):
    with subprocess.Popen(
        [sys.executable, "-c", HOLD, str(tmp_path)], stdin=subprocess.PIPE, stdout=subprocess.PIPE
    ) as process:
        assert process.stdin is not None
        assert process.stdout is not None
        assert process.stdout.readline() == b"held\n"
        with pytest.raises(Busy, match=f"anna, harmonic-filter on workshop, since .* .process {process.pid}"):
            take(("GPIB0::16::INSTR",), "bert", "second", tmp_path)
        process.stdin.close()
        process.wait()
    held = take(("GPIB0::16::INSTR",), "bert", "second", tmp_path)
    (dead,) = held.dead.values()
    assert (dead.who, dead.pid) == ("anna", process.pid)
    held.release()
    held = take(("GPIB0::16::INSTR",), "carl", "third", tmp_path)
    assert held.dead == {}, "whoever let go in good order is not named"
    held.release()


def test_a_lock_that_says_nonsense_is_still_a_lock(tmp_path):
    held = take(("GPIB0::16::INSTR",), "anna", "first", tmp_path)
    (file,) = tmp_path.iterdir()
    file.write_text("{")
    with pytest.raises(Busy, match="is held by another process"):
        take(("GPIB0::16::INSTR",), "bert", "second", tmp_path)
    held.release()


def test_a_folder_that_cannot_hold_locks_is_told(tmp_path):
    (tmp_path / "file").write_text("")
    with pytest.raises(BenchError, match=r"cannot be kept in .*BENCHRUN_HOME"):
        take(("GPIB0::16::INSTR",), "anna", "first", tmp_path / "file")


def test_the_file_names_resource_and_holder(tmp_path):
    held = take(("TCPIP0::10.0.0.7::5025::SOCKET",), "anna", "first", tmp_path)
    (file,) = tmp_path.iterdir()
    assert re.fullmatch(r"TCPIP0-10\.0\.0\.7-5025-SOCKET-[0-9a-f]{12}\.lock", file.name)
    found = json.loads(file.read_text())
    assert (found["resource"], found["pid"]) == ("TCPIP0::10.0.0.7::5025::SOCKET", os.getpid())
    held.release()


def test_a_run_at_a_bench_in_use_sends_nothing(workplace):
    w = workplace()
    held = take(("GPIB0::16::INSTR",), "anna", "first")
    with pytest.raises(Busy, match="held by anna"):
        w.run(library=None)
    assert w.mishaps.requests == []
    assert not w.job.records.exists()
    held.release()


def test_a_rehearsal_has_its_instruments_to_itself(workplace):
    held = take(("GPIB0::16::INSTR",), "anna", "first")
    assert workplace().run().code == 0
    held.release()
