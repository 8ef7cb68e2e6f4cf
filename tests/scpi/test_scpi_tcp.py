"""The session over real sockets on loopback, through pyvisa-py: every trap that was measured there."""

from __future__ import annotations

import contextlib
import socket
import threading
import time

import numpy as np
import pytest

from benchrun.clock import SystemClock
from benchrun.errors import ConnectionLost, DeadlineExceeded, FramingError, ResourceNotFound
from benchrun.scpi.opening import open_session
from benchrun.scpi.transcript import Transcript


def test_questions_and_answers(tcp):
    session = tcp(answer=lambda message: message.upper().encode() + b"\n")
    assert [session.query(m) for m in ("a?", "b?")] == ["A?", "B?"]


def test_a_message_without_answer_does_not_hold_up_the_next(tcp):
    session = tcp(answer=lambda message: b"1\n" if message.endswith("?") else b"")
    line = session._line._resource
    wire = line.visalib.sessions[line.session].interface
    assert wire.getsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY) == 1
    took = []
    for _ in range(5):
        before = time.perf_counter()
        session.write("INIT")
        session.query("*OPC?")
        took.append(time.perf_counter() - before)
    assert min(took) < 0.02  # Nagle's wait would be 40 ms each time


@pytest.mark.parametrize("framing", ["#6800000", "#0"])
def test_a_block_full_of_lf_arrives_whole(tcp, framing):
    payload = b"\n" * 800_000
    session = tcp(answer=lambda message: framing.encode() + payload + b"\n" if "DATA" in message else b"ok\n")
    values = session.query_values("DATA?", "REAL,64 NORMal", 100_000)
    np.testing.assert_array_equal(values, np.frombuffer(payload, ">f8"))
    assert session.query("Q?") == "ok"


def test_a_line_closed_while_waiting_is_lost_at_once(tcp):
    session = tcp(answer=lambda _: None)
    before = time.perf_counter()
    with pytest.raises(ConnectionLost, match="closed the line"):
        session.query("Q?", 30.0)
    assert time.perf_counter() - before < 5.0  # not the whole deadline, spinning


def test_a_line_closed_within_a_block_is_lost(tcp):
    def handler(connection):
        connection.recv(100)
        connection.sendall(b"#3800" + bytes(100))

    session = tcp(handler)
    with pytest.raises(ConnectionLost, match="closed the line"):
        session.query_values("DATA?", "REAL,64 NORMal", 100, 0.2)
    with pytest.raises(ConnectionLost):
        session.query("Q?", 0.2)


def test_clearing_a_closed_line_returns(tcp):
    session = tcp(answer=lambda _: None)
    with pytest.raises(ConnectionLost):
        session.query("Q?", 0.1)
    with pytest.raises(ConnectionLost):
        session.clear()


def test_silence_is_a_missed_deadline_and_the_late_answer_is_thrown_away(tcp):
    asked, free = [], threading.Event()

    def answer(message):
        asked.append(message)
        if len(asked) == 1:
            free.wait(5.0)
            return b"too late\n"
        return b"in time\n"

    session = tcp(answer=answer)
    with pytest.raises(DeadlineExceeded, match=r"no whole answer within 0\.05 s"):
        session.query("SLOW?", 0.05)
    free.set()
    assert session.query("Q?") == "in time"


def test_too_few_bytes_are_a_missed_deadline(tcp):
    session = tcp(answer=lambda _: b"#3800" + bytes(100))
    with pytest.raises(DeadlineExceeded):
        session.query_values("DATA?", "REAL,64 NORMal", 100, 0.1)


def test_a_dribbling_server_is_late(tcp):
    enough = threading.Event()

    def handler(connection):
        connection.recv(100)
        with contextlib.suppress(OSError):
            while not enough.wait(0.01):
                connection.sendall(b"x")

    session = tcp(handler)
    before = time.perf_counter()
    with pytest.raises(DeadlineExceeded, match=r"allowed are 0\.1 s"):
        session.query("Q?", 0.1)
    assert time.perf_counter() - before < 2.0
    enough.set()


def test_a_flood_without_end_is_left(tcp):
    def handler(connection):
        connection.recv(100)
        with contextlib.suppress(OSError):
            while True:
                connection.sendall(b"x" * 65536)

    session = tcp(handler)
    with pytest.raises(FramingError, match="without an end"):
        session.query("Q?", 5.0)
    session.clear()  # the flood goes on, clearing ends all the same


def test_a_refused_connection_is_told_when_opening(py_manager):
    with socket.create_server(("127.0.0.1", 0)) as listener:
        port = listener.getsockname()[1]
    with pytest.raises(ResourceNotFound, match=f"TCPIP::127.0.0.1::{port}::SOCKET: refuses the connection"):
        open_session(py_manager, f"TCPIP::127.0.0.1::{port}::SOCKET", SystemClock(), Transcript())


def test_garbage_is_shown_and_the_line_stays_usable(tcp):
    session = tcp(answer=lambda message: b"WHAT DO YOU MEAN\n" if "DATA" in message else b"ok\n")
    with pytest.raises(Exception, match="'WHAT DO YOU MEAN' where a data block"):
        session.query_values("DATA?", "REAL,64 NORMal", 2)
    assert session.query("Q?") == "ok"
