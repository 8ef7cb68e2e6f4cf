"""The VISA library made of a world, where it goes beyond the kit for all doors (building blocks it mends)."""

from __future__ import annotations

import time

import pytest
import pyvisa
from pyvisa.constants import AccessModes, StatusCode

from sim_instruments.bench import load_bench
from sim_instruments.doors.visa import simulated_visa

NAME = "GPIB0::7::INSTR"


@pytest.fixture
def manager(talker):
    instruments = {NAME: talker, "USB0::0x1::0x2::GEN::INSTR": talker, "TCPIP0::bench::inst0::INSTR": talker}
    manager = pyvisa.ResourceManager(simulated_visa(talker.world, instruments))
    yield manager
    manager.close()


def open_one(manager, name=NAME, **settings):
    return manager.open_resource(name, read_termination="\n", write_termination="\n", **settings)


def code_of(call, *args, **kwargs) -> StatusCode:
    with pytest.raises(pyvisa.errors.VisaIOError) as caught:
        call(*args, **kwargs)
    return StatusCode(caught.value.error_code)


def test_resources_are_listed_and_opened_in_any_spelling(manager):
    assert manager.list_resources("GPIB?*") == (NAME,)
    assert len(manager.list_resources()) == 3
    assert open_one(manager, "gpib::7").query("*OPC?") == "1"
    assert open_one(manager, "USB0::0x1::0x2::GEN::0::INSTR").query("*OPC?") == "1"


@pytest.mark.parametrize("name", ["GPIB0::8::INSTR", "TCPIP0::elsewhere::inst0::INSTR"])
def test_an_unknown_resource_is_not_found(manager, name):
    assert code_of(manager.open_resource, name) == StatusCode.error_resource_not_found


def test_a_name_that_is_none_is_invalid(manager):
    assert code_of(manager.open_resource, "NONSENSE") == StatusCode.error_invalid_resource_name


def test_a_timeout_costs_simulated_time_and_returns_at_once(manager, talker):
    client = open_one(manager, timeout=60_000)
    before = time.perf_counter()
    assert code_of(client.read) == StatusCode.error_timeout
    assert time.perf_counter() - before < 1.0
    assert talker.world.time_s == pytest.approx(60.0)


def test_a_strict_library_times_out_in_mid_operation(talker):
    manager = pyvisa.ResourceManager(simulated_visa(talker.world, {NAME: talker}, patient=False))
    client = open_one(manager, timeout=4000)
    client.write("STAR;*OPC?")
    assert code_of(client.read) == StatusCode.error_timeout
    assert talker.world.time_s == pytest.approx(4.0)
    client.timeout = 8000
    assert client.read() == "1"
    assert talker.world.time_s == pytest.approx(10.0)
    assert client.query("SYST:ERR:CODE?") == "0"
    assert code_of(client.read) == StatusCode.error_timeout
    assert talker.world.time_s == pytest.approx(18.0)
    manager.close()


def test_the_trigger_reaches_the_instrument(manager, talker):
    client = open_one(manager)
    for _ in range(4):
        client.assert_trigger()
    assert talker.fired == 4
    assert client.query("SYST:ERR:CODE?") == "-211"


def test_clients_on_a_bus_share_one_line(manager):
    first, second = open_one(manager), open_one(manager)
    first.write("*IDN?")
    assert second.read() == "SIMULATED,TALKER,7,1.0"


def test_clients_by_network_have_a_line_each(manager):
    first, second = (open_one(manager, "TCPIP0::bench::inst0::INSTR") for _ in range(2))
    first.write("*IDN?")
    assert second.query("*ESE?") == "0"
    assert first.read() == "SIMULATED,TALKER,7,1.0"
    assert first.query("SYST:ERR:CODE?") == "0"


def test_an_exclusive_lock_keeps_others_out_until_it_is_given_up(manager, talker):
    first, second = open_one(manager), open_one(manager)
    first.lock_excl()
    for call in (lambda: second.query("*IDN?"), second.read_stb, second.clear, second.assert_trigger):
        assert code_of(call) == StatusCode.error_resource_locked
    assert code_of(second.lock_excl, 5000) == StatusCode.error_resource_locked
    assert talker.world.time_s == pytest.approx(5.0)
    assert code_of(second.unlock) == StatusCode.error_session_not_locked
    assert first.query("*OPC?") == "1"
    first.unlock()
    assert second.query("*OPC?") == "1"


def test_closing_gives_a_lock_up(manager):
    first, second = open_one(manager, access_mode=AccessModes.exclusive_lock), open_one(manager)
    assert code_of(second.query, "*OPC?") == StatusCode.error_resource_locked
    assert (
        code_of(open_one, manager, access_mode=AccessModes.exclusive_lock) == StatusCode.error_resource_locked
    )
    first.close()
    assert second.query("*OPC?") == "1"


def test_a_shared_lock_admits_those_who_know_its_key(manager):
    first, second, third = open_one(manager), open_one(manager), open_one(manager)
    key = first.lock(requested_key="together")
    assert key == "together"
    second.lock(requested_key="together")
    assert second.query("*OPC?") == "1"
    assert code_of(third.query, "*OPC?") == StatusCode.error_resource_locked
    assert code_of(third.lock, requested_key="other") == StatusCode.error_resource_locked


def test_a_broken_line_is_lost_in_every_call(manager, talker):
    client = open_one(manager)
    talker.line_closed = True
    for call in (lambda: client.write("*IDN?"), client.read, client.clear, client.read_stb):
        assert code_of(call) == StatusCode.error_connection_lost
    assert code_of(open_one, manager) == StatusCode.error_resource_not_found


def test_two_worlds_share_nothing():
    worlds = [load_bench("workshop", seed) for seed in (1, 1)]
    managers = [pyvisa.ResourceManager(simulated_visa(w.world, w.instruments)) for w in worlds]
    first, second = (open_one(m, "GPIB0::16::INSTR") for m in managers)
    assert managers[0].visalib is not managers[1].visalib
    first.write("SENS:BAND 10")
    first.query("INIT;*OPC?")
    assert second.query("SENS:BAND?") == "1000"
    assert worlds[1].world.time_s == 0.0
    managers[0].close()
    assert second.query("*OPC?") == "1"
    managers[1].close()
