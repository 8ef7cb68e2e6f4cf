"""What every door must do, whichever way it leads: one kit for the VISA library, the socket and HiSLIP."""

from __future__ import annotations

import pytest
import pyvisa
from pyvisa.constants import StatusCode


def block(client, expected: int) -> bytes:
    """Read a definite block by its header and exact count."""
    header = client.read_bytes(2)
    size = int(client.read_bytes(int(header[1:2])))
    assert size == expected
    data = client.read_bytes(size + 1, chunk_size=size + 1)
    assert data[-1:] == b"\n"
    return data[:-1]


def errors(client) -> list[int]:
    found = [int(n) for n in client.query("SYST:ERR:CODE:ALL?").split(",")]
    return [] if found == [0] else found


def test_question_and_answer(client):
    assert client.query("*IDN?") == "SIMULATED,TALKER,7,1.0"
    assert client.query("*ESE 5;*ESE?;:ECHO? 'a;b'") == "5;a;b"


@pytest.mark.parametrize("termination", ["\n", "\r\n"])
def test_both_usual_terminations(opener, termination):
    client = opener(write_termination=termination)
    assert [client.query("*ESE?") for _ in range(3)] == ["0"] * 3


@pytest.mark.parametrize("payload", [b"", b"\n", b"\n" * 20_000, bytes(range(256)) * 800, b"#3#3;\n\r" * 50])
def test_a_block_arrives_byte_for_byte(client, talker, payload):
    talker.payload = payload
    client.write("BLOC?")
    assert block(client, len(payload)) == payload
    assert client.query("*OPC?") == "1"
    assert errors(client) == []


def test_pyvisas_own_block_reader(client, talker):
    talker.payload = b"\n" * 8000
    values = client.query_binary_values("BLOC?", "d", is_big_endian=True)
    assert len(values) == 1000
    assert client.query("*OPC?") == "1"


def test_a_long_block_in_small_pieces(client, talker):
    talker.payload = bytes(range(256)) * 2000
    client.chunk_size = 1000
    client.write("BLOC?")
    assert block(client, 512_000) == talker.payload


def test_a_block_goes_in_as_data(client):
    client.write_raw(b"*CLS;ECHO? #213a\nb;c'\"\nde  f\n")
    assert errors(client) == [-168]


def test_a_message_in_halves(door, client):
    client.write_raw(b"*ID")
    client.write_raw(b"N?\n")
    if door.endswith("socket"):
        assert client.read() == "SIMULATED,TALKER,7,1.0"
    else:  # END ended the first half
        assert errors(client) == [-113, -113]


def test_operations_cost_simulated_time_only(client, talker):
    before = talker.world.time_s
    assert client.query("STAR;*OPC?") == "1"
    assert talker.world.time_s - before == pytest.approx(10.0)


def test_a_fault_in_the_model_is_reported(client):
    client.write("BRE")
    assert client.query("SYST:ERR?").startswith('-300,"Device-specific error;AttributeError')


def test_closing_twice_is_once(client):
    client.close()
    client.close()


def test_use_after_closing_fails_by_name(client):
    client.close()
    with pytest.raises(pyvisa.errors.InvalidSession):
        client.query("*IDN?")


def test_one_client_after_the_other(opener):
    for n in range(3):
        client = opener()
        assert client.query(f"*ESE {n};*ESE?") == str(n)
        client.write("*IDN?") if n == 1 else None
        client.close()
    assert opener().query("*ESE?") == "2"


def test_two_clients_at_once_share_the_instrument(opener):
    first, second = opener(), opener()
    assert first.query("*ESE 9;*ESE?") == "9"
    assert second.query("*ESE?") == "9"
    second.close()
    assert first.query("*ESE?") == "9"


def test_half_a_message_of_one_client_is_not_the_others(door, opener):
    if not door.endswith("socket"):
        pytest.skip("END ends every message that is written here")
    first, second = opener(), opener()
    first.write_raw(b"*ESE 1;*ES")
    assert second.query("*OPC?") == "1"
    assert first.query("E?") == "1"


def test_a_line_that_stays_silent_times_out_and_lives(door, client, talker):
    client.timeout = 50
    before = talker.world.time_s
    with pytest.raises(pyvisa.errors.VisaIOError) as caught:
        client.read()
    assert caught.value.error_code == StatusCode.error_timeout
    if door.startswith("visa"):  # the others cannot tell that somebody waits
        assert talker.world.time_s - before == pytest.approx(0.05)
        assert errors(client) == [-420]
    client.timeout = 2000
    assert client.query("*OPC?") == "1"


class TestInstr:
    """What only INSTR resources have: serial poll, device clear, trigger."""

    @pytest.fixture(autouse=True)
    def _instr_only(self, door):
        if door.endswith("socket"):
            pytest.skip("a raw socket has no messages beside the stream")

    def test_the_serial_poll_shows_a_waiting_answer(self, client):
        assert client.read_stb() == 0
        client.write("*IDN?")
        assert client.read_stb() == 16
        client.read()
        assert client.read_stb() == 0
        client.write("*ESE 32;FOO")
        assert client.read_stb() == 4 + 32
        assert client.query("*ESE?") == "32"

    def test_an_answer_nobody_reads_is_lost_to_the_next_question(self, client):
        client.write("*IDN?")
        assert client.query("*ESE?") == "0"
        assert errors(client) == [-410]

    def test_device_clear_in_mid_block(self, door, client, talker):
        talker.payload = b"x" * 5000
        client.write("BLOC?")
        if door == "hislip":  # its client cannot clear with an answer on its way
            block(client, 5000)
        else:
            client.read_bytes(100)
        client.clear()
        assert client.query("*OPC?") == "1"
        assert errors(client) == []

    def test_device_clear_keeps_settings(self, client):
        client.query("*ESE 3;*OPC?")
        client.clear()
        assert client.query("*ESE?") == "3"

    def test_an_indefinite_block_ends_with_its_message(self, client, talker):
        talker.payload = b"ab\ncd#0\n" * 10
        client.read_termination = None
        client.write("OPEN?")
        assert client.read_raw() == b"#0" + talker.payload + b"\n"
        assert client.query("*OPC?").strip() == "1"

    def test_a_message_may_end_with_end_alone(self, opener):
        client = opener(write_termination="")
        assert client.query("*ESE 6;*ESE?") == "6"
