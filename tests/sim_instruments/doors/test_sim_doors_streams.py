"""Clients that misbehave on TCP, and HiSLIP message by message (IVI-6.1, from memory)."""

from __future__ import annotations

import socket
import struct
import threading

import pytest
from pyvisa_py.protocols import hislip

from sim_instruments.doors.frames import Kind, receive_frame, send_frame
from sim_instruments.doors.hislip import HislipDoor
from sim_instruments.doors.socket import SocketDoor


@pytest.fixture
def raw(talker):
    with SocketDoor(talker) as door:
        yield lambda: socket.create_connection((door.host, door.port), 5.0)


@pytest.fixture
def slip(talker):
    with HislipDoor(talker) as door:
        yield door


def connect(door) -> socket.socket:
    return socket.create_connection((door.host, door.port), 5.0)


def handshake(door) -> tuple[socket.socket, socket.socket]:
    first, second = connect(door), connect(door)
    send_frame(first, Kind.INITIALIZE, 0, 0x0100 << 16, b"hislip0")
    number = receive_frame(first, 100).parameter & 0xFFFF
    send_frame(second, Kind.ASYNC_INITIALIZE, 0, number)
    assert receive_frame(second, 100).kind == Kind.ASYNC_INITIALIZE_RESPONSE
    return first, second


def client_of(door) -> hislip.Instrument:
    return hislip.Instrument(door.host, port=door.port, timeout=5.0)


# -- raw socket ------------------------------------------------------------------------------------------


def test_a_client_that_vanishes_leaves_nothing_behind(raw):
    for _ in range(3):
        line = raw()
        line.sendall(b"*ESE 3;*IDN?\n*ES")
        line.setsockopt(socket.SOL_SOCKET, socket.SO_LINGER, struct.pack("ii", 1, 0))
        line.close()  # with a reset
    with raw() as line:
        line.sendall(b"*ESE?\n")
        assert line.recv(100) == b"3\n"


def test_a_client_that_does_not_read_holds_up_nobody_else(raw, talker):
    talker.payload = b"x" * 900_000
    with raw() as lazy, raw() as line:
        lazy.sendall(b"BLOC?\n" * 30)
        line.sendall(b"*OPC?\n")
        assert line.recv(100) == b"1\n"


def test_questions_sent_together_are_answered_in_turn(raw):
    with raw() as line:
        line.sendall(b"*ESE 1;*ESE?\n*ESE 2;*ESE?\n*OPC?\n")
        said = b""
        while said.count(b"\n") < 3:
            said += line.recv(100)
        assert said == b"1\n2\n1\n"


def test_closing_the_door_ends_its_connections(talker):
    with SocketDoor(talker) as door:
        line = connect(door)
        line.sendall(b"*OPC?\n")
        assert line.recv(100) == b"1\n"
    assert line.recv(100) == b""
    with pytest.raises(OSError, match="refused"):
        connect(door)
    line.close()


def test_hanging_up_welcomes_new_clients(talker):
    with SocketDoor(talker) as door:
        with connect(door) as line:
            line.sendall(b"*OPC?\n")
            assert line.recv(100) == b"1\n"
            door.hang_up()
            assert line.recv(100) == b""
        with connect(door) as line:
            line.sendall(b"*OPC?\n")
            assert line.recv(100) == b"1\n"


# -- HiSLIP ----------------------------------------------------------------------------------------------


def test_the_handshake_refuses_overlap(slip):
    with connect(slip) as first:
        send_frame(first, Kind.INITIALIZE, 1, 0x0100 << 16, b"hislip0")
        answer = receive_frame(first, 100)
    assert (answer.kind, answer.control) == (Kind.INITIALIZE_RESPONSE, 0)
    assert answer.parameter >> 16 == 0x0100


@pytest.mark.parametrize(
    ("data", "code", "says"),
    [
        (b"GET / HTTP/1.1\r\n\r\n", 1, b"begins with 'HS'"),
        (struct.pack("!2sBBIQ", b"HS", 7, 0, 0, 0), 3, b"begins with Initialize"),
        (struct.pack("!2sBBIQ", b"HS", 0, 0, 0, 7) + b"hislip9", 3, b"no 'hislip9' here"),
        (struct.pack("!2sBBIQ", b"HS", 17, 0, 99, 0), 3, b"no client 99"),
    ],
)
def test_a_wrong_beginning_is_fatal_and_named(slip, data, code, says):
    with connect(slip) as line:
        line.sendall(data)
        answer = receive_frame(line, 1000)
        assert (answer.kind, answer.control) == (Kind.FATAL_ERROR, code)
        assert says in answer.payload
        assert line.recv(1) == b""


def test_messages_need_both_connections(slip):
    with connect(slip) as first:
        send_frame(first, Kind.INITIALIZE, 0, 0x0100 << 16, b"hislip0")
        receive_frame(first, 100)
        send_frame(first, Kind.DATA_END, 0, 0, b"*IDN?\n")
        answer = receive_frame(first, 1000)
    assert (answer.kind, answer.control) == (Kind.FATAL_ERROR, 2)


def test_an_unknown_message_is_an_error_and_the_line_lives(slip):
    first, second = handshake(slip)
    for line in (first, second):
        send_frame(line, 99, 0, 0, b"what")  # type: ignore[arg-type]
        answer = receive_frame(line, 1000)
        assert (answer.kind, answer.control) == (Kind.ERROR, 1)
    send_frame(first, Kind.DATA_END, 0, 2, b"*OPC?")
    assert receive_frame(first, 100).payload == b"1\n"
    first.close()
    second.close()


def test_a_message_too_large_is_an_error_and_the_line_lives(slip):
    first, second = handshake(slip)
    send_frame(first, Kind.DATA_END, 0, 2, b" " * ((1 << 20) + 1))
    answer = receive_frame(first, 1000)
    assert (answer.kind, answer.control) == (Kind.ERROR, 4)
    send_frame(first, Kind.DATA_END, 0, 4, b"*OPC?")
    assert receive_frame(first, 100).payload == b"1\n"
    first.close()
    second.close()


def test_answers_keep_to_the_clients_size_and_carry_its_message_number(slip, talker):
    talker.payload = bytes(1000)
    first, second = handshake(slip)
    send_frame(second, Kind.ASYNC_MAXIMUM_MESSAGE_SIZE, 0, 0, struct.pack("!Q", 300))
    assert struct.unpack("!Q", receive_frame(second, 100).payload)[0] == 1 << 20
    send_frame(first, Kind.DATA, 0, 6, b"BLO")
    send_frame(first, Kind.DATA_END, 0, 8, b"C?")
    frames = [receive_frame(first, 300)]
    while frames[-1].kind != Kind.DATA_END:
        frames.append(receive_frame(first, 300))
    assert b"".join(f.payload for f in frames) == b"#6001000" + bytes(1000) + b"\n"
    assert {f.parameter for f in frames} == {8}
    assert len(frames) == 4
    first.close()
    second.close()


@pytest.mark.parametrize("tell", [False, True])
def test_a_lost_answer_is_told(talker, tell):
    with HislipDoor(talker, tell_interrupted=tell) as door:
        first, second = handshake(door)
        send_frame(first, Kind.DATA_END, 0, 2, b"*IDN?\n")
        send_frame(first, Kind.DATA_END, 0, 4, b"SYST:ERR:CODE?\n")
        kinds = [receive_frame(first, 100) for _ in range(3)]
        assert [f.kind for f in kinds] == [Kind.DATA_END, Kind.INTERRUPTED, Kind.DATA_END]
        assert kinds[-1].payload == b"-410\n"
        if tell:
            assert receive_frame(second, 100).kind == Kind.ASYNC_INTERRUPTED
        first.close()
        second.close()


def test_a_delivered_answer_is_not_lost(slip):
    client = client_of(slip)
    client.send(b"*IDN?\n")
    client.receive(100)
    assert client.async_status_query() == 0  # takes the client's delivered flag with it
    client.send(b"SYST:ERR:CODE?\n")
    assert client.receive(100) == b"0\n"
    client.close()


def test_the_trigger_message_reaches_the_instrument(slip, talker):
    client = client_of(slip)
    client.trigger()
    client.send(b"*OPC?\n")
    assert client.receive(100) == b"1\n"
    assert talker.fired == 1
    client.close()


def test_remote_and_local_are_acknowledged(slip):
    client = client_of(slip)
    client.async_remote_local_control("enableRemote")
    client.close()


def test_locks_are_real(slip):
    first, second = client_of(slip), client_of(slip)
    assert first.async_lock_info() == 0
    assert first.async_lock_request(0.0) == "success"
    assert first.async_lock_request(0.0) == "error"  # held already
    assert second.async_lock_info() == 1
    assert second.async_lock_request(0.01) == "failure"
    assert second.async_lock_release() == "error"
    second.send(b"*ESE 5\n")
    first.send(b"*ESE?\n")
    assert first.receive(100) == b"0\n"  # the other one's message waits
    assert first.async_lock_release() == "success"
    second.send(b"*ESE?\n")
    assert second.receive(100) == b"5\n"
    first.close()
    second.close()


def test_a_shared_lock_by_its_key(slip):
    first, second, third = (client_of(slip) for _ in range(3))
    assert first.async_lock_request(0.0, "together") == "success"
    assert second.async_lock_request(0.0, "together") == "success"
    assert third.async_lock_request(0.0, "other") == "failure"
    assert second.async_lock_release() == "success shared"
    assert first.async_lock_release() == "success shared"
    assert third.async_lock_request(0.0) == "success"
    for client in (first, second, third):
        client.close()


def test_a_lock_waits_for_its_holder_to_leave(slip):
    first, second = client_of(slip), client_of(slip)
    assert first.async_lock_request(0.0) == "success"
    threading.Timer(0.05, first.close).start()
    assert second.async_lock_request(4.0) == "success"
    second.close()


def test_messages_on_their_way_are_dropped_by_a_clear(slip):
    first, second = handshake(slip)
    send_frame(second, Kind.ASYNC_DEVICE_CLEAR, 0, 0)
    assert receive_frame(second, 100).kind == Kind.ASYNC_DEVICE_CLEAR_ACKNOWLEDGE
    send_frame(first, Kind.DATA_END, 0, 2, b"*ESE 9\n")
    send_frame(first, Kind.DEVICE_CLEAR_COMPLETE, 0, 0)
    assert receive_frame(first, 100).kind == Kind.DEVICE_CLEAR_ACKNOWLEDGE
    send_frame(first, Kind.DATA_END, 0, 4, b"*ESE?\n")
    assert receive_frame(first, 100).payload == b"0\n"
    first.close()
    second.close()


def test_a_client_that_vanishes_gives_up_everything(slip, talker):
    first, second = handshake(slip)
    send_frame(second, Kind.ASYNC_LOCK, 1, 0)
    assert receive_frame(second, 100).control == 1
    first.sendall(b"HS\x07")  # half a header
    first.close()
    second.close()
    other = client_of(slip)
    assert other.async_lock_request(4.0) == "success"
    other.send(b"*OPC?\n")
    assert other.receive(100) == b"1\n"
    other.close()
