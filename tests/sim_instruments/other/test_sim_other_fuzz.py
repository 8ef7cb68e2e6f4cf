"""Any message to any instrument of the amplifier's bench: no fault of a model, ever."""

from __future__ import annotations

import re

import numpy as np
import pytest

from sim_instruments.bench import load_bench

PARAMETERS = (
    "", "MIN", "MAX", "DEF", "ON", "OFF", "0", "1", "-1", "1E9", "9.91E37", "-1E30", "1 GHZ", "3 V", "10 DBM",
    "1,2,3", "(@101)", "(@101:105)", "(@)", "'x'", "#12ab", "TRACE", "GRID", "TRACE1", "ASC", "REAL,32",
    "BUS", "IMM", "EXT", "POS", "SAMP", "AVER", "ONCE", "W", "K", "#HFF", "1E400", "1e-400",
)  # fmt: skip
COMMON = (
    "*RST",
    "*CLS",
    "*TRG",
    "*OPC?",
    "*OPC",
    "*WAI",
    "*STB?",
    "*ESR?",
    "*IDN?",
    "ABOR",
    "INIT",
    "OUTP ON",
)


def _names() -> list[str]:
    return list(load_bench("amplifier", 1).instruments)


@pytest.mark.parametrize("name", _names())
def test_messages_made_of_its_own_words(name: str) -> None:
    """Headers it knows with parameters that fit or not, in any order: never -300, and it still answers."""
    bench = load_bench("amplifier", 1)
    bench.world.offer("DA-0001")
    bench.world.connect([(["unit"], [3, 4])])
    instrument = bench.instruments[name]
    line, rng = instrument.line(), np.random.default_rng(3)
    headers = [re.sub(r"[\[\]]|<\d+>", "", header) for header in instrument.tree.headers]
    # Whole networks of readings are slow; that instrument has a fuzz run of its own.
    count, done = 100 if "NA-" in instrument.identity[1] else 400, 0
    for _ in range(count):
        if rng.random() < 0.3:
            message = str(rng.choice(COMMON))
        else:
            header = str(rng.choice(headers)) + ("?" if rng.random() < 0.5 else "")
            message = f"{header} {rng.choice(PARAMETERS)}"
        line.receive(message.encode() + b"\n")
        line.proceed(1e3)
        while line.has_output:
            line.take(1 << 30)
        assert not any(error.startswith("-300") for error in instrument.status.errors), message
        done += not instrument.status.errors
        instrument.status.errors.clear()
    assert 0.1 < done / count < 0.9  # not all were refused, nor all taken
    line.clear()
    line.receive(b"*RST;*CLS;*IDN?\n")
    assert line.take(100)[0].startswith(b"SIMULATED")
