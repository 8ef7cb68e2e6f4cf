"""Message exchange, status, error queue (IEEE 488.2 chapters 6 and 10 to 12; SCPI-1999 Vol. 2, 20 and 21)."""

from __future__ import annotations

import pytest

from sim_instruments.scpi.line import Line


@pytest.mark.parametrize("ending", ["\n", "\r\n", " \n"])
def test_the_identity_has_four_fields(bench, ending):
    bench.line.receive(b"*IDN?" + ending.encode())
    assert bench.read() == b"SIMULATED,NA,1,1.0\n"


def test_end_ends_a_message_without_lf(bench):
    bench.line.receive(b"*OPC?", end=True)
    assert bench.read() == b"1\n"
    bench.line.receive(b"*OP")
    bench.line.receive(b"C?", end=True)
    assert bench.read() == b"1\n"


def test_answers_of_one_message_are_joined(bench):
    assert bench.ask("SENS:SWE:POIN 51;POIN?;*ESE 7;*ESE?;:FREQ:STAR?") == "51;7;9000"


@pytest.mark.parametrize(
    ("message", "errors"),
    [
        ("SENS:FREQ:STAR 1 GHZ;STOP 2 GHZ", []),
        ("SENS:FREQ:STAR 1 GHZ;*OPC;STOP 2 GHZ", []),
        ("SENS:FREQ:STAR 1 GHZ;:STOP 2 GHZ", [-113]),
        ("SENS:FREQ:STAR 1 GHZ;FREQ:STOP 2 GHZ", [-113]),
        ("SENS:FREQ:STAR 1 GHZ;:SENS:SWE:POIN 3;SPAC LOG", []),
        ("FREQ:STAR 1 GHZ;STOP 2 GHZ", []),
        ("FREQ:NONE 1;STAR 1 GHZ", [-113, -113]),
    ],
)
def test_the_path_stays_after_a_semicolon_and_a_colon_leads_to_the_root(bench, message, errors):
    assert bench.after(message) == errors


@pytest.mark.parametrize(
    ("message", "code"),
    [
        ("FOO", -113), ("FOO?", -113), ("*FOO", -113), ("*IDN", -113), ("*RST?", -113),
        ("SENS:SWE:TIME 1", -113),
        ("SENS2:FREQ:STAR 1E9", -114),
        ("SENS:FREQ:STAR", -109), ("SENS:FREQ:STAR 1E9,2E9", -108), ("*RST 1", -108), ("*OPC? 1", -108),
        ("TRAC?", -109), ("TRAC? GRID,MATRIX", -108), ("FORM REAL,64,1", -108), ("FREQ:STAR? 5", -108),
        ("FREQ:STAR? MIN,MAX", -108), ("FREQ:STAR? FOO", -141), ("LIST:FREQ 1E9", -109),
        ("FREQ:STAR 1 S", -131), ("SWE:POIN 3 HZ", -138), ("FREQ:STAR 1 TERAHZ", -131),
        ("SWE:POIN 1", -222), ("FREQ:STAR 1 THZ", -131), ("BAND 0", -222), ("*ESE 256", -222),
        ("SWE:SPAC SQRT", -224), ("SWE:SPAC 1", -128), ("FORM REAL,48", -224), ("FORM INT", -224),
        ("CALC:FEED 'XTIM:RAT 1,1'", -224), ("CALC:FEED 'XFR:RAT 3,1'", -224), ("CALC:FEED 1", -128),
        ("TRAC? NOISE", -224), ("TRAC? 'NOISE'", -224), ("TRAC? 1", -128),
        ("INIT:CONT MAYBE", -141), ("OUTP 'ON'", -158), ("FREQ:STAR #15hello", -168), ("FREQ:STAR (1)", -178),
        ("LIST:FREQ 2E9,1E9", -221), ("CALC:DATA?", -230), ("*TRG", -211),
    ],
)  # fmt: skip
def test_each_mistake_has_its_number(bench, message, code):
    """Texts and numbers: SCPI-1999 Vol. 2, 21.8."""
    bench.write("*CLS")
    assert bench.after(message) == [code]


def test_a_list_longer_than_the_instrument_holds_is_too_much(make_bench):
    bench = make_bench(limits={"points": 3})
    assert bench.after("LIST:FREQ 1E9,2E9,3E9") == []
    assert bench.after("LIST:FREQ 1E9,2E9,3E9,4E9") == [-223]
    assert bench.ask("LIST:FREQ?").count(",") == 2


def test_minimum_maximum_and_default_as_value_and_as_question(bench):
    assert bench.ask("FREQ:STAR? MIN;STAR? MAX;STOP? DEF") == "9000;20000000000;20000000000"
    assert bench.ask("BAND MAX;BAND?;BAND MIN;BAND?;BAND DEF;BAND?") == "1000000;1;1000"
    assert bench.ask("SWE:POIN MIN;POIN?;POIN? MAX;POIN DEF;POIN?") == "2;100001;201"


def test_numbers_in_other_bases_and_with_units(bench):
    assert (
        bench.ask("SWE:POIN #H65;POIN?;:BAND 0.0003 MHZ;BAND?;:BWID 1.5E1 KHZ;BAND:RES?") == "101;300;15000"
    )


def test_the_format_is_told_as_it_was_set(bench):
    assert bench.ask("FORM?") == "ASC,0"
    assert bench.ask("FORM REAL;FORM?;FORM REAL,32;FORM:DATA?;:FORM ASC,5;:FORM?") == "REAL,64;REAL,32;ASC,5"
    assert bench.ask("FORM:BORD?;BORD SWAPPED;BORD?") == "NORM;SWAP"


def test_errors_come_oldest_first_with_their_texts(bench):
    bench.write("*CLS;FOO;BAND 0;:TRAC? MATRIX;*TRG")
    assert bench.ask("SYST:ERR:COUN?") == "4"
    assert bench.ask("SYST:ERR?") == '-113,"Undefined header;FOO"'
    assert bench.ask("SYST:ERR:NEXT?") == '-222,"Data out of range;0"'
    assert bench.ask("SYST:ERR:CODE?") == "-230"
    assert bench.ask("SYST:ERR:ALL?") == '-211,"Trigger ignored"'
    assert bench.ask("SYST:ERR?") == '0,"No error"'


def test_a_full_queue_loses_the_newest_and_says_so(bench):
    bench.write("*CLS")
    for _ in range(25):
        bench.write("FOO")
    found = bench.errors()
    assert len(found) == bench.analyzer.status.queue
    assert found[-1] == -350
    assert set(found[:-1]) == {-113}
    assert int(bench.ask("*ESR?")) & 8  # the overflow is an error of the device


@pytest.mark.parametrize(("message", "bit"), [("FOO", 32), ("BAND 0", 16), ("*OPC", 1), ("*IDN?;*OPC?", 4)])
def test_event_bits_stand_until_they_are_read(bench, message, bit):
    assert bench.ask("*ESR?") == "128"  # power on
    bench.write(message)
    bench.read()
    assert bench.ask("*ESR?") == str(bit)
    assert bench.ask("*ESR?") == "0"


def test_a_query_may_not_follow_an_answer_of_arbitrary_form(bench):
    """IEEE 488.2, 10.14: ``*IDN?`` is the last query of its message."""
    assert bench.ask("*IDN?;*OPC?") == "SIMULATED,NA,1,1.0"
    assert bench.errors() == [-440]


def test_the_status_byte_sums_up(bench):
    bench.write("*CLS")
    line = bench.line
    assert line.status_byte() == 0
    bench.write("*ESE 32;FOO")
    assert line.status_byte() == 4 + 32
    bench.write("*SRE 36")
    assert line.status_byte() == 4 + 32 + 64
    assert bench.ask("*STB?") == "100"
    bench.write("*SRE 255")
    assert bench.ask("*SRE?") == "191"  # bit 6 cannot be enabled
    bench.write("*CLS;*SRE 16;*ESE?")
    assert line.status_byte() == 16 + 64
    assert bench.read() == b"32\n"
    assert line.status_byte() == 0
    assert bench.ask("*OPC?;*STB?") == "1;80"


def test_clear_status_clears_events_and_errors_but_no_enables(bench):
    bench.write("*ESE 60;*SRE 48;STAT:OPER:ENAB 8;:STAT:QUES:ENAB 9;:FOO;:INIT;*OPC")
    bench.world.advance(1e4)
    bench.write("*CLS")
    assert bench.ask("*ESR?;*ESE?;*SRE?;:STAT:OPER?;OPER:ENAB?;:STAT:QUES:ENAB?") == "0;60;48;0;8;9"
    assert bench.errors() == []


def test_clear_status_after_an_unread_answer_leaves_nothing(bench):
    bench.write("*IDN?")
    bench.write("*CLS")
    assert not bench.line.has_output
    assert bench.errors() == []


def test_reset_leaves_status_and_errors_alone(bench):
    bench.write("*ESE 1;*SRE 2;STAT:OPER:ENAB 8;:FOO;:BAND 10;:INIT;*RST")
    assert bench.ask("*ESE?;*SRE?;:STAT:OPER:ENAB?;:BAND?") == "1;2;8;1000"
    assert bench.errors() == [-113]
    assert int(bench.ask("STAT:OPER:COND?")) == 0  # the sweep was stopped


def test_transition_filters_choose_the_edge(bench):
    bench.write("STAT:OPER:PTR 0;NTR 8;ENAB 8;:INIT")
    assert bench.ask("STAT:OPER?") == "0"
    bench.world.advance(100.0)
    assert bench.line.status_byte() & 128
    assert bench.ask("STAT:OPER?") == "8"
    assert bench.ask("STAT:OPER?") == "0"
    bench.write("STAT:PRES;*CLS;:INIT;*WAI")
    assert bench.ask("STAT:OPER?;OPER:PTR?;NTR?;ENAB?") == "8;32767;0;0"


def test_registers_hold_fifteen_bits(bench):
    assert bench.ask("STAT:QUES:ENAB 65535;ENAB?") == "32767"
    assert bench.after("STAT:QUES:ENAB 65536") == [-222]


def test_a_new_message_before_the_answer_was_read_interrupts(bench):
    bench.write("*IDN?")
    bench.write("*ESE?")
    assert bench.read() == b"0\n"
    assert bench.errors() == [-410]
    bench.write("*IDN?")
    assert bench.line.take(4) == (b"SIMU", False)
    assert bench.ask("*OPC?") == "1"
    assert bench.errors() == [-410]


def test_blank_lines_interrupt_nothing(bench):
    bench.line.receive(b"*OPC?\n\r\n \n")
    assert bench.read() == b"1\n"


def test_reading_with_nothing_asked_is_unterminated(bench):
    bench.line.unasked()
    bench.line.receive(b"*IDN")
    bench.line.unasked()
    bench.line.receive(b"?\n")
    bench.read()
    assert bench.errors() == [-420, -420]


def test_an_answer_larger_than_the_queue_deadlocks(bench, monkeypatch):
    monkeypatch.setattr(Line, "output_bytes", 4000)
    assert bench.ask("INIT;*ESE 5;*ESE?;:CALC:DATA?;*ESE?;*ESE 6") == ""
    assert bench.errors() == [-430]
    assert bench.ask("*ESE?") == "6"  # the rest of the message was carried out


def test_an_input_overrun_drops_the_whole_message(bench, monkeypatch):
    monkeypatch.setattr(Line, "input_bytes", 1000)
    bench.write("*CLS")
    for _ in range(30):
        bench.line.receive(b"*ESE 7;" * 10)
    bench.line.receive(b"*ESE 8\n*ESE 9\n")
    assert bench.ask("*ESE?") == "9"
    assert bench.errors() == [-363]
    bench.line.receive(b"x" * 1001, end=True)
    assert bench.ask("*OPC?") == "1"
    assert bench.errors() == [-363]


def test_device_clear_forgets_what_is_on_its_way_and_keeps_settings(bench):
    bench.write("BAND 30;:FOO")
    bench.line.receive(b"*ESE 5;")
    bench.line.clear()
    assert bench.ask("*ESE?;:BAND?") == "0;30"
    bench.write("*IDN?")
    bench.line.clear()
    assert not bench.line.has_output
    assert bench.errors() == [-113]


def test_device_clear_frees_a_message_that_waits_for_ever(bench):
    bench.write("TRIG:SOUR EXT;:INIT;*OPC?;*ESE 3")
    assert bench.read() == b""
    assert bench.line.held
    bench.write("*ESE?")
    assert bench.read() == b""
    bench.line.clear()
    assert bench.ask("*ESE?") == "0"


def test_two_lines_have_their_own_buffers_and_share_the_instrument(bench):
    other = bench.analyzer.line()
    bench.line.receive(b"*ES")
    other.receive(b"*ESE 4;*IDN?\n")
    bench.line.receive(b"E?\n")
    assert bench.read() == b"4\n"
    assert other.take(100) == (b"SIMULATED,NA,1,1.0\n", True)
    assert bench.errors() == []


def test_a_stream_gets_each_answer_and_knows_no_interruption(bench):
    said: list[bytes] = []
    line = bench.analyzer.line(said.append)
    line.receive(b"*ESE?\n*OPC?\n*ES")
    line.receive(b"E?\n")
    assert said == [b"0\n", b"1\n", b"0\n"]
    assert bench.errors() == []


def test_a_fault_in_the_model_shows_in_the_queue(bench, monkeypatch):
    monkeypatch.setattr(bench.readings, "read", lambda *_: 1 / 0)
    bench.write("INIT;*WAI")
    bench.read()
    assert bench.ask("SYST:ERR?") == '-300,"Device-specific error;ZeroDivisionError division by zero"'


def test_bytes_beyond_ascii_are_refused_and_the_line_lives(bench):
    bench.line.receive(b"BAND\xff 1\n\xfe\x00\n*OPC?\n")
    assert bench.read() == b"1\n"
    assert bench.errors() == [-101, -101]


def test_version_self_test_and_catalogue(bench):
    assert bench.ask("SYST:VERS?;*TST?;:TRAC:CAT?") == '1999.0;0;"GRID","MATRIX","SWITCH"'
