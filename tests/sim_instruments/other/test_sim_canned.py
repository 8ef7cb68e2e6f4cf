"""An instrument described in PyVISA-sim's YAML, beside the others."""

from __future__ import annotations

import pytest

from sim_instruments.bench import load_bench
from sim_instruments.faults import inject

DEVICE = {
    "dialogues": [{"q": "MEAS:TEMP?", "r": "22.8"}, {"q": "*IDN?", "r": "ANOTHER,MAKER,0,0"}],
    "properties": {
        "interval": {
            "default": 1.0,
            "getter": {"q": "TRIG:TIM?", "r": "{:.1f}"},
            "setter": {"q": "TRIG:TIM {:.1f}"},
            "specs": {"min": 0.1, "max": 60, "type": "float"},
        }
    },
}


@pytest.fixture
def client(make_bench):
    return make_bench().add({"kind": "pyvisa-sim", "device": DEVICE})


def test_dialogues_and_properties(client) -> None:
    """As defined, in capitals or not, several in a message."""
    assert client.ask("meas:temp?") == "22.8"
    client.write("TRIG:TIM 2.5")
    assert client.ask("TRIG:TIM?;:MEAS:TEMP?") == "2.5;22.8"
    assert client.errors() == []


def test_it_has_the_manners_of_the_others(client) -> None:
    """Identity, error queue, status and reset, which its definition does not have."""
    assert client.ask("*IDN?") == "SIMULATED,X-1,1,1.0"
    assert client.ask("*OPC?") == "1"
    client.write("TRIG:TIM 5", "*RST")
    assert client.ask("TRIG:TIM?") == "1.0"


@pytest.mark.parametrize(
    ("message", "number"), [("MEAS:WIND?", -113), ("JUMP", -113), ("TRIG:TIM 99", -222), ("MEAS:TEMP", -113)]
)
def test_what_it_refuses(client, message: str, number: int) -> None:
    """In the error queue, instead of a word in place of an answer."""
    assert client.errors(message) == [number]


def test_a_definition_that_makes_no_sense(make_bench) -> None:
    """A sentence, not the library's traceback."""
    with pytest.raises(ValueError, match="no device for PyVISA-sim: In device device, malformed dialogue"):
        make_bench().add({"kind": "pyvisa-sim", "device": {"dialogues": [{"q": "A?"}, {"r": "1"}]}})


def test_faults_befall_it_too() -> None:
    """It stands behind the same lines."""
    bench = inject(load_bench("amplifier", 1), "no answer", resource="GPIB0::31::INSTR")
    line = bench.instruments["GPIB0::31::INSTR"].line()
    line.receive(b"MEAS:TEMP?\n")
    assert not line.has_output
