"""Serving a bench to anybody's program, hands by words, and the drawing."""

from __future__ import annotations

import io
import re
import sys
import threading
from pathlib import Path

import pytest
import pyvisa

import sim_instruments
from sim_instruments.__main__ import main
from sim_instruments.bench import load_bench
from sim_instruments.console import Console, NotUnderstood, read_links
from sim_instruments.look import draw
from sim_instruments.serve import opened, serve

README = Path(sim_instruments.__file__).parent / "README.md"
ROW = "jig-left, unit, jig-right from port 1 to port 2"


@pytest.fixture
def bench():
    return load_bench("workshop", 1)


@pytest.fixture
def console(bench):
    return Console(bench, io.StringIO())


def said(console, *lines: str) -> str:
    console.run(io.StringIO("\n".join(lines) + "\n"))
    return console.out.getvalue()


def run(*arguments: str, typed: str = "") -> tuple[int, str, str]:
    out, complaints = io.StringIO(), io.StringIO()
    code = main(arguments, io.StringIO(typed), out, complaints)
    return code, out.getvalue(), complaints.getvalue()


def test_the_script_of_the_readme_reads_a_trace(bench, monkeypatch, capsys):
    (script,) = re.findall(r"```python\n(.*?)```", README.read_text(encoding="utf-8"), re.DOTALL)
    assert len(script.splitlines()) <= 22
    assert said(Console(bench, io.StringIO()), "unit HF-0001", f"connect {ROW}")
    with opened(bench) as doors:
        monkeypatch.setattr(sys, "argv", ["script.py", doors[0].hislip])
        exec(compile(script, str(README), "exec"), {"__name__": "__main__"})
    lines = capsys.readouterr().out.splitlines()
    assert lines[0] == "SIMULATED,NA-2,S0016,1.0"
    assert lines[-1] == '0,"No error"'
    level = {float(line.split()[0]): float(line.split()[2]) for line in lines[1:-1]}
    assert len(level) == 11
    assert level[140.0] > -10.0  # in the pass band, with the analyzer's own losses
    assert level[500.0] < -40.0


def test_served_instruments_are_those_of_the_bench(bench):
    manager = pyvisa.ResourceManager("@py")
    with opened(bench) as doors:
        for one in doors:
            for name in (one.hislip, one.socket):
                client = manager.open_resource(name, read_termination="\n", write_termination="\n")
                assert client.query("*IDN?").split(",")[1:3] == one.identity.split()[1:]
                client.close()
    manager.close()


def test_serving_prints_names_and_takes_orders(bench):
    out = io.StringIO()
    serve(bench, io.StringIO("connect short to port 1\ntime\nstop\n"), out)
    text = out.getvalue()
    assert len(re.findall(r"TCPIP0::127\.0\.0\.1::hislip0,\d+::INSTR", text)) == len(bench.instruments)
    assert len(re.findall(r"TCPIP0::127\.0\.0\.1::\d+::SOCKET", text)) == len(bench.instruments)
    assert "connected: short on port 1" in text
    assert bench.world.connection == "short on port 1"


def test_orders_reach_the_analyzer_while_it_is_served(bench):
    manager = pyvisa.ResourceManager("@py")
    console = Console(bench, io.StringIO())
    with opened(bench) as doors:
        client = manager.open_resource(doors[1].socket, read_termination="\n", write_termination="\n")
        client.write("*RST;:SWE:POIN 2;:OUTP ON")
        levels = []
        for words in ("connect short to port 1", "connect load to port 1"):
            console.carry_out(words)
            levels.append(abs(float(client.query("INIT;:CALC:DATA?").split(",")[0])))
        client.close()
    manager.close()
    assert levels[0] != levels[1]


@pytest.mark.parametrize(
    ("words", "links"),
    [
        ("short to port 1", [(["short"], [1])]),
        ("short on port 2", [(["short"], [2])]),
        (ROW, [(["jig-left", "unit", "jig-right"], [1, 2])]),
        ("thru from port 2 to port 1", [(["thru"], [2, 1])]),
        ("short to port 1 and open to port 2", [(["short"], [1]), (["open"], [2])]),
    ],
)
def test_connections_in_words(words, links):
    assert read_links(words) == links


@pytest.mark.parametrize(
    ("words", "says"),
    [
        ("", "does not say what goes where"),
        ("short", "does not say what goes where"),
        ("short to port one", "does not say what goes where"),
        ("short to port 3", "there is no port 3"),
        ("thru from port 1 to port 1", "named twice"),
        ("short to port 1 and open to port 1", "named twice"),
        ("a,,b to port 1", "a comma without an item"),
    ],
)
def test_words_that_make_no_sense_say_what_would(words, says):
    with pytest.raises(NotUnderstood, match=says):
        read_links(words)


def test_what_hangs_on_the_other_port_stays(console):
    said(console, "connect short to port 1", "connect open to port 2", "connect load to port 1")
    assert console.bench.world.connection == "load on port 1 and open on port 2"
    said(console, "disconnect port 2")
    assert console.bench.world.connection == "load on port 1"
    said(console, "connect thru from port 1 to port 2", "connect load to port 2")
    assert console.bench.world.connection == "load on port 2"
    said(console, "disconnect")
    assert console.bench.world.connection == "nothing"


@pytest.mark.parametrize(
    ("line", "says"),
    [
        ("wat", "'wat' is no command; there are connect"),
        ("connect shrt to port 1", "not done: the bench has no 'shrt'"),
        ("connect unit to port 1", "not done: no unit lies on the bench"),
        ("unit", "which one? This bench knows HF-0001"),
        ("unit XX-1", "has no unit 'XX-1'"),
        ("disconnect port 7", "'port 7' is no port"),
        ("wait a bit", "'a bit' is no time"),
        ("\x00\xff", "is no command"),
        ("help", "lay a unit on the bench"),
        ("time", "0 min 0.0 s on the bench's clock"),
        ("wait 90", "1 min 30.0 s"),
        ("look", "port 2  ──  nothing"),
    ],
)
def test_every_line_gets_a_plain_answer(console, line, says):
    assert says in said(console, line)


def test_an_empty_line_is_nothing_and_the_end_is_the_end(console):
    assert said(console, "", "  ", "STOP", "wat") == ""


def test_the_drawing_shows_rows_and_what_is_left(bench):
    said(Console(bench, io.StringIO()), "unit HF-0001", f"connect {ROW}")
    text = draw(bench)
    row = next(line for line in text.splitlines() if "unit HF-0001" in line)
    assert re.search(r"port 1 ═+│ jig-left │═+│ unit HF-0001 │═+│ jig-right │═+ port 2", row)
    table = next(line for line in text.splitlines() if line.startswith("on the table"))
    assert "jig-left" not in table
    assert "short" in table
    assert "GPIB0::17::INSTR  SIMULATED NA-1 S0017" in text
    said(Console(bench, io.StringIO()), "connect short to port 2")
    text = draw(bench)
    assert "port 1  ──  nothing" in text
    assert re.search(r"port 2 ═+│ short │", text)
    assert "unit HF-0001" in next(line for line in text.splitlines() if line.startswith("on the table"))


def test_look_as_a_command():
    code, out, complaints = run("look", "workshop", "--do", "connect short to port 1")
    assert code == 0
    assert "│ short │" in out
    assert "connected" in complaints


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (("look", "nowhere"), "there is no simulated bench 'nowhere'"),
        (("serve", "missing.yaml"), "missing.yaml"),
        (("look", "workshop", "--do", "connect shrt to port 1"), "no 'shrt'"),
        (("look", "workshop", "--seed", "-1"), "--seed"),
        (("serve", "workshop", "--port", "70000"), "--port"),
    ],
)
def test_bad_input_is_told_in_a_sentence(arguments, says):
    code, out, complaints = run(*arguments)
    assert (code, out) == (2, "")
    assert says in complaints


def test_a_port_in_use_is_told(bench):
    with opened(bench) as doors:
        taken = doors[0].socket.split("::")[2]
        code, _, complaints = run("serve", "workshop", "--port", taken)
    assert code == 2
    assert f"cannot serve at port {taken}" in complaints


def test_serve_as_a_command_ends_with_its_input():
    before = threading.active_count()
    code, out, _ = run("serve", "workshop", typed="time\n")
    assert code == 0
    assert "on the bench's clock" in out
    assert threading.active_count() == before
