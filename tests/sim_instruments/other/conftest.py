"""A small bench of generator, spectrum analyzer and what lies between, made without a file."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from sim_instruments.draws import Draws
from sim_instruments.instruments.kinds import KINDS
from sim_instruments.instruments.routing import WiredWorld
from sim_instruments.parts import build
from sim_instruments.parts.base import Part
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.waves import Real

AMPLIFIER = {
    "kind": "amplifier", "gain": 16, "at": 1e8, "corner": 1e12, "input": 60, "output": 60, "reverse": 80,
    "P1dB": 20, "IP3": 32, "noise figure": 3, "supply": 5, "current": 0.08,
}  # fmt: skip
GENERATOR = {
    "kind": "signal generator", "ports": [3], "match": 80, "harmonics": [-200, -200], "level error": 0,
    "flatness": 0, "drift": 0, "reference": 0, "noise": -200,
}  # fmt: skip
ANALYZER = {
    "kind": "spectrum analyzer", "ports": [4], "match": 80,
    "mixer": {
        "noise figure": 20, "second harmonic intercept": 200, "third order intercept": 200,
        "compression": 200, "overload": 100, "phase noise": -200, "level error": 0, "flatness": 0,
        "attenuator error": 0, "drift": 0, "reference": 0,
    },
}  # fmt: skip
"""A generator and an analyzer without faults: what is read then is the part's."""


class Client:
    """One instrument on one line, read at once."""

    def __init__(self, instrument: Instrument) -> None:
        self.instrument = instrument
        self.line = instrument.line()

    def write(self, *messages: str) -> None:
        for message in messages:
            self.line.receive(message.encode() + b"\n")

    def ask_bytes(self, message: str) -> bytes:
        self.write(message)
        self.line.proceed()
        return self.line.take(1 << 30)[0]

    def ask(self, message: str) -> str:
        return self.ask_bytes(message).decode("ascii").removesuffix("\n")

    def number(self, message: str) -> float:
        return float(self.ask(message))

    def errors(self, *messages: str) -> list[int]:
        self.write(*messages)
        self.line.proceed()
        self.line.take(1 << 30)
        found = [int(n) for n in self.ask("SYST:ERR:CODE:ALL?").split(",")]
        return [] if found == [0] else found

    def trace(self, *settings: str) -> Real:
        self.write(*settings, "INIT")
        return np.array([float(v) for v in self.ask("TRAC? TRACE").split(",")])


class Bench:
    """A world of perfect connections."""

    def __init__(self, **items: dict[str, Any]) -> None:
        self.world = WiredWorld(1, {k: build(v, Draws(1) / k) for k, v in items.items()}, humidity=0.0)
        self.put("thru", build({"kind": "standard", "standard": "thru"}, Draws(1)))

    def put(self, name: str, part: Part) -> None:
        self.world.items = {**self.world.items, name: part}

    def add(self, spec: dict[str, Any], **more: Any) -> Client:
        spec = {**spec, **more}
        identity = ("SIMULATED", "X-1", "1", "1.0")
        return Client(KINDS[spec["kind"]](self.world, identity, spec, Draws(1) / "x" / len(str(spec))))


@pytest.fixture
def make_bench() -> Callable[..., Bench]:
    return Bench


@pytest.fixture
def amplifier() -> dict[str, Any]:
    return dict(AMPLIFIER)


@pytest.fixture
def generator() -> dict[str, Any]:
    return dict(GENERATOR)


@pytest.fixture
def analyzer() -> dict[str, Any]:
    return {**ANALYZER, "mixer": dict(ANALYZER["mixer"])}  # type: ignore[call-overload]
