"""Help of every command: complete, and quick because nothing heavy is imported for it."""

# ruff: noqa: E501 - the table reads as one command a line

from __future__ import annotations

import subprocess
import sys

import pytest
from click import Group, Option

import benchrun
from benchrun.cli.main import program

COMMANDS = {
    (): ("audit", "bench", "check", "keys", "match", "overnight", "rehearse", "resume", "run", "sequences", "--version", "Exit codes: 0 pass"),
    ("audit",): ("RECORD...",),
    ("bench",): ("FILE", "--simulated"),
    ("check",): ("FILES", "--schema", "sequence|bench|kit|mask"),
    ("keys",): ("make", "list", "trust", "distrust", "export", "BENCHRUN_HOME"),
    ("keys", "make"): ("NAME", "--protect"),
    ("keys", "trust"): ("FILE", "--label", "--rehearsal"),
    ("keys", "list"): (),
    ("keys", "distrust"): ("KEY_ID",),
    ("keys", "export"): ("NAME",),
    ("match",): ("RECORD|FILE", "--load", "--at", "--port", "--z0", "--vswr", "--coils", "--capacitors", "--q", "--json"),
    ("overnight",): ("FILE", "--operator", "--key", "--records", "--afresh"),
    ("rehearse",): ("SEQUENCE", "--all", "--bench", "--unit", "--seed", "--fault", "--operator", "--records", "--json", "--unattended"),
    ("resume",): ("RECORDS", "--close", "--key", "--json", "--unattended"),
    ("run",): ("SEQUENCE", "--bench", "--unit", "--batch", "--key", "--operator", "--records", "--json", "--unattended"),
    ("sequences",): (),
}  # fmt: skip
HEAVY = ("numpy", "pyvisa", "pyvisa_sim", "pydantic", "rich", "skrf", "yaml", "cryptography", "sim_instruments", "orjson")  # fmt: skip


@pytest.mark.parametrize("command", list(COMMANDS), ids=" ".join)
def test_help_names_everything(cli, command):
    for option in ("--help", "-h"):
        answer = cli(*command, option)
        assert (answer.code, answer.err) == (0, "")
        assert answer.out.startswith("Usage: ")
        for words in COMMANDS[command]:
            assert words in answer.out


def test_no_option_is_missing_above():
    def walk(command, path):
        if isinstance(command, Group):
            for name in command.list_commands(None):
                yield from walk(command.get_command(None, name), (*path, name))
        yield path, [o for p in command.params if isinstance(p, Option) for o in p.opts if not p.hidden]

    found = dict(walk(program, ()))
    assert set(found) == set(COMMANDS)
    for path, options in found.items():
        for option in options:
            assert option in (*COMMANDS[path], "-h", "--help"), (path, option)


@pytest.mark.slow
def test_help_imports_nothing_heavy():
    code = f"""
import sys
from benchrun.cli.main import _main
for command in {list(COMMANDS)!r}:
    assert _main([*command, "--help"]) == 0
    loaded = [name for name in {HEAVY!r} if name in sys.modules]
    assert not loaded, (command, loaded)
"""
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr


def test_version(cli):
    assert cli("--version").out == f"benchrun {benchrun.__version__}\n"


def test_what_can_be_called_by_name(cli, small_filter, tmp_path):
    (tmp_path / "sequences").mkdir()
    (tmp_path / "sequences" / "small-filter.yaml").write_text(small_filter)
    (tmp_path / "sequences" / "broken.yaml").write_text("sequence: broken\n")
    answer = cli("sequences")
    assert answer.code == 0
    assert "  small-filter                 Harmonic low-pass filter, few points\n" in answer.out
    assert "  harmonic-filter              Harmonic low-pass filter, final test\n" in answer.out
    assert "  broken                       cannot be used: " in answer.out
    for words in ("workshop-second", "n50-workshop", "harmonic-filter-stop", "jig-left.s2p"):
        assert words in answer.out
    assert cli("rehearse", "small-filter").code == 0
    assert cli("check", "sequences/small-filter.yaml").out == "1 file checked, no problems\n"
