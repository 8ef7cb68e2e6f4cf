"""Overlapped sweeps, triggers and who waits (IEEE 488.2 chapter 12; SCPI-1999 Vol. 2, 24, from memory)."""

from __future__ import annotations

import numpy as np
import pytest


def test_complete_is_noted_when_the_sweep_ends_and_not_before(bench):
    bench.write("*CLS;INIT;*OPC")
    assert int(bench.ask("*ESR?")) & 1 == 0
    bench.world.advance(bench.analyzer.sweep_s)
    assert int(bench.ask("*ESR?")) & 1 == 1


def test_a_poll_comes_to_an_end(bench):
    bench.write("*CLS;:INIT;*OPC")
    assert any(int(bench.ask("*ESR?")) & 1 for _ in range(100))
    bench.write("INIT")
    assert any(int(bench.ask("STAT:OPER:COND?")) & 8 == 0 for _ in range(100))
    bench.write("*CLS;*ESE 1;:INIT;*OPC")
    assert any(bench.line.status_byte() & 32 for _ in range(100))


def test_asking_for_completion_waits_in_simulated_time(bench):
    before = bench.world.time_s
    assert bench.ask("INIT;*OPC?") == "1"
    assert bench.world.time_s - before == pytest.approx(bench.analyzer.sweep_s)
    assert bench.ask("*OPC?") == "1"
    assert bench.world.time_s - before == pytest.approx(bench.analyzer.sweep_s)


def test_wait_holds_up_what_follows(bench):
    bench.write("INIT;*WAI;*ESE 5")
    assert bench.line.held
    assert bench.analyzer.status.ese == 0
    bench.write("*ESE?")
    assert bench.read() == b"5\n"
    assert bench.readings.made == 1


def test_an_answer_that_waits_longer_than_the_client_comes_later(bench):
    sweep_s = bench.analyzer.sweep_s
    bench.write("INIT;*OPC?")
    bench.line.proceed(sweep_s / 2)
    assert not bench.line.has_output
    assert bench.world.time_s == pytest.approx(sweep_s / 2)
    bench.line.proceed(sweep_s)
    assert bench.world.time_s == pytest.approx(sweep_s)
    assert bench.read() == b"1\n"
    assert bench.errors() == []


def test_readings_wait_for_the_sweep(bench):
    assert bench.ask("SWE:POIN 3;:INIT;:FORM ASC,3;:CALC:DATA?").startswith("+1.20E-02,+0.00E+00,")
    assert bench.world.time_s > 0


def test_a_second_start_is_ignored(bench):
    assert bench.after("INIT;INIT") == [-213]
    assert bench.after("*WAI;:INIT:CONT ON;:INIT") == [-213]


def test_abort_ends_the_sweep_without_readings(bench):
    assert bench.after("*CLS;:INIT;*OPC;:ABOR") == []
    assert bench.ask("*ESR?") == "1"  # nothing is pending any more
    assert bench.ask("STAT:OPER:COND?") == "0"
    assert bench.after("CALC:DATA?") == [-230]
    assert bench.readings.made == 0


def test_clear_status_and_device_clear_forget_a_completion_asked_for(bench):
    for forget in (lambda: bench.write("*CLS"), bench.line.clear):
        bench.write("*CLS;:INIT;*OPC")
        forget()
        assert bench.ask("*OPC?;*ESR?") == "1;0"


def test_a_bus_trigger_starts_the_sweep(bench):
    bench.write("TRIG:SOUR BUS;:INIT")
    assert bench.ask("STAT:OPER:COND?") == "32"  # waiting for trigger
    bench.write("*TRG")
    assert bench.ask("STAT:OPER:COND?") == "8"  # sweeping
    assert bench.ask("*OPC?") == "1"
    assert bench.after("*TRG") == [-211]
    bench.write("INIT")
    bench.analyzer.group_trigger()
    assert bench.ask("*OPC?") == "1"
    bench.analyzer.group_trigger()
    assert bench.errors() == [-211]


def test_readings_that_nothing_will_trigger_are_a_deadlock(bench):
    for source in ("BUS", "EXT"):
        assert bench.after(f"TRIG:SOUR {source};:INIT;:CALC:DATA?") == [-214]
        bench.write("ABOR")
    assert bench.after("TRIG:SOUR EXT;:INIT;*TRG") == [-211]
    bench.write("TRIG:SOUR IMM")
    assert bench.ask("*OPC?") == "1"
    assert bench.readings.made == 1


def test_continuous_sweeping_gives_new_readings_sweep_after_sweep(bench):
    bench.write("SWE:POIN 2;:FORM REAL,64;:INIT:CONT ON")
    assert bench.ask("*OPC?") == "1"  # no pending operation
    first = _value(bench)
    assert _value(bench) == first
    bench.world.advance(3.5 * bench.analyzer.sweep_s)
    assert _value(bench) == first + 1e-3
    bench.write("BAND 100")
    assert _value(bench) == pytest.approx(first + 2e-3)
    bench.write("INIT:CONT OFF;*OPC?")
    assert bench.read() == b"1\n"
    assert bench.ask("INIT:CONT?;:STAT:OPER:COND?") == "0;0"


def test_continuous_sweeping_survives_settings_that_allow_no_sweep(bench):
    bench.write("INIT:CONT ON;:FREQ:STOP 1E6;STAR 2E6;STOP 3E6")
    assert bench.ask("TRAC:POIN? GRID") == "201"
    bench.write("ABOR")
    assert int(bench.ask("STAT:OPER:COND?")) == 8
    assert bench.errors() == []


def test_continuous_sweeping_on_bus_triggers(bench):
    bench.write("TRIG:SOUR BUS;:INIT:CONT ON;*TRG")
    bench.world.advance(10.0)
    assert bench.ask("STAT:OPER:COND?") == "32"
    bench.write("*TRG;:INIT:CONT OFF;*WAI")
    assert bench.ask("TRAC:POIN? MATRIX;:STAT:OPER:COND?") == "201;0"


def test_a_setting_in_mid_sweep_ends_it_or_is_refused(make_bench):
    gentle, strict = make_bench(), make_bench(manners={"while sweeping": "refuse"})
    for bench in (gentle, strict):
        bench.write("INIT;:BAND 300;*WAI")
    assert (gentle.ask("BAND?"), gentle.readings.made, gentle.errors()) == ("300", 0, [])
    assert (strict.ask("BAND?"), strict.readings.made, strict.errors()) == ("1000", 1, [-221])
    assert strict.after("BAND 300") == []


def test_a_setting_makes_readings_stale_and_the_format_does_not(bench):
    bench.write("SWE:POIN 2;:INIT;*WAI;:FORM REAL,32;:FORM:BORD SWAP;:OUTP ON;:CALC:FEED 'XFR:RAT 2,1'")
    bench.write("CALC:DATA?")
    values = np.frombuffer(bench.read()[4:-1], "<f4")
    np.testing.assert_allclose(values, [22e-3, 0, 22e-3, 0], rtol=1e-6)
    assert bench.after("SOUR:POW -20;:CALC:DATA?") == [-230]


@pytest.mark.parametrize(("form", "dtype"), [("REAL,64", "f8"), ("REAL,32", "f4")])
@pytest.mark.parametrize(("order", "sign"), [("NORM", ">"), ("SWAP", "<")])
def test_blocks_in_both_sizes_and_orders(bench, form, dtype, order, sign):
    bench.write(f"SWE:POIN 3;:FORM {form};:FORM:BORD {order};:INIT;:TRAC? MATRIX")
    block = bench.read()
    digits = int(block[1:2])
    payload = block[2 + digits : -1]
    assert int(block[2 : 2 + digits]) == len(payload)
    assert block.endswith(b"\n")
    rows = np.frombuffer(payload, sign + dtype).reshape(3, 4, 2)
    np.testing.assert_allclose(rows[:, :, 0], np.tile([12e-3, 22e-3, 13e-3, 23e-3], (3, 1)), rtol=1e-6)


def test_a_list_is_swept_as_it_was_given(bench):
    bench.write("LIST:FREQ 1 GHZ,1.5E9,4000 MHZ;:FREQ:MODE LIST;:FORM ASC,4;:INIT;:TRAC? GRID")
    assert bench.read() == b"+1.000E+09,+1.500E+09,+4.000E+09\n"
    assert bench.ask("LIST:FREQ:POIN?;:SWE:POIN?") == "3;3"
    assert bench.after("*RST;:FREQ:MODE LIST;:INIT") == [-221]


def test_start_must_lie_below_stop_when_the_sweep_begins(bench):
    assert bench.after("FREQ:STAR 5E9;STOP 1E9") == []
    assert bench.after("INIT") == [-221]


def test_centre_and_span_stay_within_the_range(make_bench):
    bench = make_bench(limits={"frequency": ["1 GHz", "3 GHz"]})
    assert bench.ask("FREQ:CENT 2 GHZ;SPAN 1 GHZ;STAR?;STOP?") == "1500000000;2500000000"
    assert (
        bench.ask("FREQ:CENT 2.8 GHZ;STAR?;STOP?;CENT?;SPAN?") == "2600000000;3000000000;2800000000;400000000"
    )
    assert bench.ask("FREQ:SPAN:FULL;:FREQ:STAR?;SPAN?") == "1000000000;2000000000"
    assert bench.after("FREQ:CENT 4 GHZ") == [-222]


def _value(bench) -> float:
    bench.write("CALC:DATA?")
    return float(np.frombuffer(bench.read()[4:-1], ">f8")[0])


def test_a_power_sweep_is_one_of_levels_at_one_frequency(bench) -> None:
    """GRID answers the levels; frequency settings are kept for later."""
    bench.write("FREQ:CW 169.4 MHZ;STAR 100 MHZ;STOP 200 MHZ;:SOUR:POW:MODE SWE;STAR -30 DBM;STOP 0 DBM")
    bench.write("SWE:POIN 4;:OUTP ON;:INIT")
    assert [float(x) for x in bench.ask("TRAC? GRID").split(",")] == [-30.0, -20.0, -10.0, 0.0]
    assert bench.ask("TRAC:POIN? MATRIX;:SOUR:POW:MODE?;:FREQ:CW?") == "4;SWE;169400000"
    bench.write("SOUR:POW:MODE FIX;:INIT")
    assert float(bench.ask("TRAC? GRID").split(",")[0]) == 100e6


def test_a_power_sweep_needs_its_ends_in_order(bench) -> None:
    """-221 when it begins."""
    assert bench.after("SOUR:POW:MODE SWE;STAR 0;STOP -20") == []
    assert bench.after("INIT") == [-221]


def test_a_cold_instrument_says_so(make_bench) -> None:
    """Bit 4 (temperature) of QUEStionable (SCPI-1999 Vol. 2, 20.3, from memory)."""
    bench = make_bench()
    assert bench.ask("STAT:QUES:COND?") == "0"
    bench.readings.is_cold = lambda: True
    assert bench.ask("STAT:QUES:COND?") == "16"
