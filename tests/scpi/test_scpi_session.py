"""The session's manners over a fake PyVISA resource: settings, queries, the error queue, deadlines."""

from __future__ import annotations

import json

import pytest
from pyvisa.constants import StatusCode
from pyvisa.errors import InvalidSession, VisaIOError

from benchrun.errors import (
    ConnectionLost,
    DeadlineExceeded,
    FramingError,
    InstrumentError,
    ReplyError,
    TransportError,
)

NO_ERROR = b'0,"No error"\n'


def test_both_terminators_are_lf(fake):
    _, resource = fake({})
    assert (resource.read_termination, resource.write_termination) == ("\n", "\n")


def test_settings_leave_as_one_message_with_opc(fake):
    session, resource = fake(lambda m: b"1\n" if "*OPC?" in m else NO_ERROR)
    session.set("*RST", "*CLS", "FREQ:STAR 1 MHZ", ":FREQ:STOP 2 MHZ")
    assert resource.sent == ["*RST;*CLS;:FREQ:STAR 1 MHZ;:FREQ:STOP 2 MHZ;*OPC?", "SYST:ERR?"]


def test_no_settings_send_nothing(fake):
    session, resource = fake({})
    session.set()
    assert resource.sent == []


def test_opc_must_answer_one(fake):
    session, _ = fake({"X;*OPC?": b"0\n"})
    with pytest.raises(ReplyError, match=r"GPIB0::16::INSTR after 'X;\*OPC\?': answered '0' where \"1\""):
        session.complete("X")


@pytest.mark.parametrize("reply", [b"hello\n", b"hello\r\n", b"hello"])
def test_a_reply_loses_its_terminator(fake, reply):
    session, _ = fake({"Q?": reply})
    assert session.query("Q?") == "hello"


def test_a_reply_that_is_not_ascii_is_refused(fake):
    session, _ = fake({"Q?": b"25 \xb5s\n"})
    with pytest.raises(ReplyError, match="plain text") as caught:
        session.query("Q?")
    assert caught.value.reply == "25 µs"


@pytest.mark.parametrize(
    ("reply", "value"), [("1", 1.0), ("+2.50E+3", 2500.0), (" .5", 0.5), ("9.91E37", 9.91e37), ("-3.", -3.0)]
)
def test_numbers_are_read(fake, reply, value):
    session, _ = fake({"Q?": reply.encode() + b"\n"})
    assert session.query_float("Q?") == value


@pytest.mark.parametrize("reply", ["", "nan", "inf", "1_000", "1 V", "1,2", "0x10", "ON"])
def test_what_is_no_scpi_number_is_refused(fake, reply):
    session, _ = fake({"Q?": reply.encode() + b"\n"})
    with pytest.raises(ReplyError, match="a number was expected"):
        session.query_float("Q?")


@pytest.mark.parametrize("message", ["OUTP ON\nOUTP OFF", "FREQ 1 Ω", "A\x00", "A\r"])
def test_a_message_that_would_be_two_or_not_text_is_not_sent(fake, message):
    session, resource = fake({})
    with pytest.raises(FramingError, match="cannot be sent in one message"):
        session.write(message)
    assert resource.sent == []


class TestErrorQueue:
    def queue(self, *replies):
        waiting = [r.encode() + b"\n" for r in replies]
        return lambda message: b"1\n" if "*OPC?" in message else waiting.pop(0) if waiting else NO_ERROR

    def test_an_error_names_the_request_that_caused_it(self, fake):
        session, resource = fake(self.queue('-222,"Data out of range;FREQ"', '-113,"Undefined header"'))
        with pytest.raises(InstrumentError) as caught:
            session.set("FREQ 1 THZ")
        assert (caught.value.number, caught.value.text) == (-222, "Data out of range;FREQ")
        assert caught.value.request == "FREQ 1 THZ"
        assert resource.sent.count("SYST:ERR?") == 3  # until the queue is empty
        session.raise_errors("next")  # and so the next request is not blamed

    def test_all_errors_stand_in_the_transcript(self, fake):
        session, _ = fake(self.queue('-222,"a"', '-113,"b"'))
        with pytest.raises(InstrumentError):
            session.set("X")
        assert [e.text for e in session.transcript.exchanges if e.text.startswith("-")] == [
            '-222,"a"',
            '-113,"b"',
        ]

    @pytest.mark.parametrize(
        ("reply", "text"),
        [
            ('-113,""', "Undefined header"),
            ("-410", "Query INTERRUPTED"),
            ('-150,"say ""no"""', 'say "no"'),
            ('-199,""', "Command error"),
            ('12,""', "of the instrument's own, see its manual"),
            ("-222, Data out of range", "Data out of range"),
        ],
    )
    def test_texts(self, fake, reply, text):
        session, _ = fake(self.queue(reply))
        with pytest.raises(InstrumentError) as caught:
            session.raise_errors("X")
        assert caught.value.text == text

    def test_a_queue_that_never_ends_is_left(self, fake):
        session, resource = fake(lambda _: b'-100,"Command error"\n')
        with pytest.raises(ReplyError, match="an error queue that ends") as caught:
            session.raise_errors("X")
        assert len(resource.sent) == 100
        assert isinstance(caught.value.__cause__, InstrumentError)

    @pytest.mark.parametrize("reply", ["", "hello", "1_0,x", "0.5,x"])
    def test_nonsense_from_the_queue_is_refused(self, fake, reply):
        session, _ = fake(self.queue(reply))
        with pytest.raises(ReplyError, match="an error number and text"):
            session.raise_errors("X")

    @pytest.mark.parametrize("reply", ['0,"No error"', '+0,"No error"', "0"])
    def test_an_empty_queue_is_no_error(self, fake, reply):
        session, resource = fake(self.queue(reply))
        session.raise_errors("X")
        assert len(resource.sent) == 1


class TestDeadlines:
    def test_silence_costs_the_whole_deadline_in_bench_time(self, fake, bench_time):
        session, _ = fake({})
        with pytest.raises(DeadlineExceeded, match="no whole answer within 900 s") as caught:
            session.query("SLOW?", 900.0)
        assert bench_time.now == pytest.approx(900.0)
        assert caught.value.limit_s == 900.0

    def test_real_waiting_is_bounded_where_time_is_simulated(self, fake):
        session, resource = fake({"SLOW?": b"1\n"})
        session.query("SLOW?", 7200.0)
        assert all(1.0 <= timeout <= 2000.0 for timeout in resource.timeouts)

    def test_an_answer_that_is_whole_but_late_is_refused(self, fake, bench_time):
        session, resource = fake({"Q?": b"1\n"})
        resource.on_read = lambda: bench_time.advance(4.0)
        with pytest.raises(DeadlineExceeded, match="took 8 s for a whole answer, allowed are 5 s"):
            session.query("Q?")

    def test_work_done_while_sending_counts(self, fake, bench_time):
        def answer(message):
            bench_time.advance(30.0)
            return b"1\n"

        session, _ = fake(answer)
        with pytest.raises(DeadlineExceeded, match="took 30 s"):
            session.complete("INIT", 10.0)

    def test_a_deadline_of_nothing_is_not_the_default(self, fake, bench_time):
        session, resource = fake({"Q?": b"1\n"})
        resource.on_read = lambda: bench_time.advance(0.1)
        with pytest.raises(DeadlineExceeded):
            session.query("Q?", 0.0)

    def test_a_dribbling_instrument_is_late(self, fake, bench_time):
        session, resource = fake({"Q?": b"x" * 10_000})
        resource.on_read = lambda: bench_time.advance(0.4)
        with pytest.raises(DeadlineExceeded, match="allowed are 5 s"):
            session.query("Q?")
        assert len(resource.timeouts) <= 14
        assert len(resource.buffer) > 9_900  # it was never read in one long gulp

    def test_a_line_without_end_is_left(self, fake):
        session, resource = fake({}, end=False)
        resource.on_read = lambda: resource.buffer.extend(b"x" * 65536)
        with pytest.raises(FramingError, match="1,048,576 bytes without an end"):
            session.query("Q?")


class TestAfterTrouble:
    def test_a_half_read_answer_is_cleared_before_the_next_request(self, fake):
        session, resource = fake({"DATA?": b"#18abc", "Q?": b"yes\n"}, end=False)
        with pytest.raises(DeadlineExceeded):
            session.query_values("DATA?", "REAL,64 NORMal", 1)
        resource.buffer += b"left over\n"
        assert session.query("Q?") == "yes"
        assert resource.clears == 1

    def test_a_good_answer_is_not_cleared(self, fake):
        session, resource = fake({"Q?": b"yes\n"})
        session.query("Q?")
        session.query("Q?")
        assert resource.clears == 0

    def test_a_back_end_that_cannot_clear_says_so(self, fake):
        session, resource = fake({})
        resource.clear_error = NotImplementedError("clear")
        with pytest.raises(ConnectionLost, match="device clear"):
            session.clear()

    def test_a_closed_session_sends_nothing(self, fake):
        session, resource = fake({})
        session.close()
        session.close()
        with pytest.raises(ConnectionLost, match="the session is closed"):
            session.write("OUTP ON")
        assert resource.closes == 1
        assert resource.sent == []


@pytest.mark.parametrize(
    ("error", "kind"),
    [
        (ConnectionRefusedError(111, "Connection refused"), ConnectionLost),
        (BrokenPipeError(32, "Broken pipe"), ConnectionLost),
        (RuntimeError("Connection was dropped by server."), ConnectionLost),
        (TimeoutError("timed out"), DeadlineExceeded),
        (InvalidSession(), ConnectionLost),
        (VisaIOError(StatusCode.error_connection_lost), ConnectionLost),
        (VisaIOError(StatusCode.error_serial_parity), FramingError),
        (VisaIOError(StatusCode.error_allocation), TransportError),
    ],
)
def test_lower_errors_become_ours_and_keep_their_cause(fake, error, kind):
    session, _ = fake(lambda _: error)
    with pytest.raises(kind, match=r"^GPIB0::16::INSTR after 'X': ") as caught:
        session.write("X")
    assert type(caught.value) is kind
    assert caught.value.__cause__ is error
    assert session.transcript.exchanges[-1].way == "failed"


def test_the_transcript_keeps_every_message_with_its_time(fake, bench_time):
    session, _ = fake({"Q?": b"yes\n", "DATA?": b"#18\x3f\xf0\0\0\0\0\0\0\n"})
    bench_time.advance(1.5)
    session.query("Q?")
    session.query_values("DATA?", "REAL,64 NORMal")
    lines = [json.loads(line) for line in session.transcript.as_json_lines().decode().splitlines()]
    assert [(x["way"], x["text"][:16]) for x in lines] == [
        ("sent", "Q?"), ("received", "yes"), ("sent", "DATA?"), ("received", "block of 8 bytes"),
    ]  # fmt: skip
    assert lines[0] == {"at_s": 1.5, "resource": "GPIB0::16::INSTR", "way": "sent", "text": "Q?"}


def test_identity(fake):
    session, _ = fake({"*IDN?": b"SIMULATED,NA-3, 0007,1.0\n"})
    who = session.identity()
    assert (who.model, who.serial, who.origin) == ("NA-3", "0007", "simulated")


@pytest.mark.parametrize("reply", ["", "A,B,C", "A,B,C,D,E", ",B,C,D", "A,,0,0"])
def test_an_identity_of_other_than_four_fields_is_refused(fake, reply):
    session, _ = fake({"*IDN?": reply.encode() + b"\n"})
    with pytest.raises(ReplyError, match="four fields"):
        session.identity()
