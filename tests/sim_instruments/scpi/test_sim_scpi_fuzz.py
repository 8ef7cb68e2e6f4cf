"""Random and mutated messages: no crash, no hang, and the right class of error for each malformed kind.

Half are mutated at random and half malformed in a known way; ``SIM_FUZZ_MESSAGES`` says how many in all.
"""

from __future__ import annotations

import os
import random

import pytest

from sim_instruments.scpi.errors import TEXTS

CHUNK = int(os.environ.get("SIM_FUZZ_MESSAGES", "100000")) // 20
GOOD = (
    "*IDN?", "*RST", "*CLS", "*ESE 32;*SRE 16", "*ESR?;*STB?;*ESE?", "*OPC?", "*WAI", "ABOR", "INIT", "*TRG",
    "SENS:FREQ:STAR 5 MHZ;STOP 1.2 GHZ", "FREQ:CENT 1E9;SPAN? MAX", "SWE:POIN 3;SPAC LOG;TIME?", "BAND 1 KHZ",
    "LIST:FREQ 1E9,2E9,3E9", "FREQ:MODE LIST", "AVER:COUN 4;STAT ON", "SOUR:POW -10 DBM", "OUTP 1",
    "FORM REAL,64", "FORM ASC", "FORM:BORD SWAP", "TRIG:SOUR BUS", "TRIG:SOUR IMM", "INIT:CONT ON",
    "INIT:CONT OFF", "CALC:FEED 'XFR:RAT 2,1'", "CALC:DATA?", "TRAC? GRID", 'TRAC? "MATRIX"', "SYST:ERR?",
    "SYST:ERR:ALL?", "STAT:OPER:ENAB #H8;PTR 0;NTR 8", "STAT:QUES?;:STAT:PRES", "SWE:POIN #B101",
)  # fmt: skip
ALPHABET = "ABCDEFINOPRSTabcdef0123456789 :;,?*'\"#()+-.@&%\t\r\x00\x7f\xe9\xa0\n"
MALFORMED = (
    ("&{0}", -199, -100), ("{0}&", -199, -100), ("NONE:{0}", -199, -100), ("'{0}", -199, -100),
    ("BAND {1}{1}X", -199, -100), ("BAND", -109, -109), ("BAND 1,{1}", -108, -108), ("BAND (1", -171, -171),
    ("BAND '{1}", -151, -151), ("BAND #9{1}", -161, -161), ("BAND #Q9", -121, -121),
    ("BAND 1 FURLONG", -131, -131),
    ("SWE:POIN {1} HZ", -138, -138), ("BAND 1E3{1}9", -222, -222), ("SWE:POIN -{1}", -222, -222),
    ("SWE:SPAC W{1}", -299, -141), ("SENS{1}9:BAND 1", -114, -114), ("TRAC? W{1}", -224, -224),
)  # fmt: skip


def mutated(chance: random.Random) -> str:
    """A good message with some characters changed, lost, doubled or moved; or anything at all."""
    if chance.random() < 0.1:
        return "".join(chance.choices(ALPHABET, k=chance.randrange(40)))
    message = ";".join(chance.choices(GOOD, k=chance.randrange(1, 4)))
    for _ in range(chance.randrange(5)):
        at = chance.randrange(len(message) + 1)
        what = chance.randrange(4)
        if what == 0:
            message = message[:at] + chance.choice(ALPHABET) + message[at:]
        elif what == 1:
            message = message[:at] + message[at + 1 :]
        elif what == 2:
            message = message[:at] + chance.choice(ALPHABET) + message[at + 1 :]
        else:
            message = message[at:] + message[:at]
    return message


def torment(bench, chance: random.Random, count: int) -> int:
    """Send so many messages; whatever happens, the line answers afterwards. Gives the number of errors."""
    entries = 0
    for n in range(count):
        data = mutated(chance).encode("latin-1")
        cut = chance.randrange(len(data) + 1)
        bench.line.receive(data[:cut])
        bench.line.receive(data[cut:] + b"\n", end=chance.random() < 0.5)
        if chance.random() < 0.7:
            bench.line.proceed()
            bench.line.take(1 << 20)
        if n % 20 == 19:
            entries += healthy(bench)
    return entries


def healthy(bench) -> int:
    """After a device clear it must tell its errors, all known to the standard and none of its own making."""
    bench.line.clear()
    bench.write("*CLS" if not bench.analyzer.status.errors else "SYST:ERR:CODE:ALL?")
    told = bench.line.take(10_000)[0].decode()
    found = [int(code) for code in told.split(",")] if told else []
    for code in found:
        assert code in TEXTS, code
        assert code != -300, bench.analyzer.status.errors
    bench.write("*RST;:SWE:POIN 11;*OPC?")
    assert bench.read() == b"1\n"
    return len(found)


@pytest.mark.slow
@pytest.mark.parametrize("seed", range(10))
def test_anything_at_all_is_borne(bench, seed):
    assert torment(bench, random.Random(seed), CHUNK) > CHUNK / 5


@pytest.mark.slow
@pytest.mark.parametrize("seed", range(10))
def test_each_malformed_kind_reports_its_class(bench, seed):
    chance = random.Random(seed)
    for _ in range(CHUNK):
        pattern, low, high = chance.choice(MALFORMED)
        message = pattern.format(chance.choice(GOOD), chance.randrange(3, 10))
        bench.write("*CLS")
        bench.write(message)
        bench.read()
        first = int(bench.analyzer.status.errors[0].split(",")[0])
        assert low <= first <= high, message
        bench.line.clear()
