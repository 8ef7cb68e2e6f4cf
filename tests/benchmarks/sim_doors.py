"""How fast a simulated bench is: making it, one sweep, reading all four readings through each door.

The yardstick is a plain numpy evaluation of the same chain: fixture, ladder, fixture, couplers, cables, noise
and the bytes of the answer. HiSLIP and the socket are served by threads of this process.

Usage: python tests/benchmarks/sim_doors.py [ROUNDS]
"""

from __future__ import annotations

import statistics
import sys
import time
from collections.abc import Callable
from typing import Any

import numpy as np
import pyvisa

from sim_instruments.bench import load_bench
from sim_instruments.doors.hislip import HislipDoor
from sim_instruments.doors.socket import SocketDoor
from sim_instruments.doors.visa import simulated_visa

ANALYZER = "GPIB0::16::INSTR"
POINTS = (1601, 20001)
BENCHES = ("workshop", "amplifier")
TARGETS_MS = {
    ("read", "in process", 20001): 30.0,
    ("read", "HiSLIP", 20001): 50.0,
    ("sweep", "", 1601): 5.0,
    **{("world", name, 0): 20.0 for name in BENCHES},
}


def median_ms(work: Callable[[], Any], rounds: int, clock: Callable[[], float] = time.perf_counter) -> float:
    """Median time of some rounds after two that do not count, in ms."""
    took = []
    for _ in range(rounds + 2):
        start = clock()
        work()
        took.append((clock() - start) * 1e3)
    return statistics.median(took[2:])


def plain(f: np.ndarray, rng: np.random.Generator) -> bytes:
    """The same chain by hand: about as much algebra as the simulation has to do."""
    w = 2j * np.pi * f

    def ladder(parts: list[tuple[str, float]]) -> list[np.ndarray]:
        a, b, c, d = np.ones_like(w), np.zeros_like(w), np.zeros_like(w), np.ones_like(w)
        for kind, value in parts:
            if kind == "C":
                y = w * value
                a, c = a + b * y, c + d * y
            else:
                z = w * value + abs(w) * value / 140
                b, d = a * z + b, c * z + d
        return [a, b, c, d]

    def line(delay: float, z0: float, loss: float) -> list[np.ndarray]:
        g = loss / 8.686 * np.sqrt(f / 1e9) + w * delay
        return [np.cosh(g), z0 * np.sinh(g), np.sinh(g) / z0, np.cosh(g)]

    def s_of(m: list[np.ndarray]) -> list[np.ndarray]:
        a, b, c, d = m
        t = a + b / 50 + c * 50 + d
        return [(a + b / 50 - c * 50 - d) / t, 2 / t, 2 / t, (-a + b / 50 - c * 50 + d) / t]

    def join(p: list[np.ndarray], q: list[np.ndarray]) -> list[np.ndarray]:
        k = 1 / (1 - p[3] * q[0])
        return [
            p[0] + p[1] * q[0] * p[2] * k,
            p[1] * q[1] * k,
            q[2] * p[2] * k,
            q[3] + q[2] * p[3] * q[1] * k,
        ]

    low_pass = [("C", 17.6e-12), ("L", 60.8e-9), ("C", 33.4e-12), ("L", 68.4e-9), ("C", 33.4e-12)]
    low_pass += [("L", 60.8e-9), ("C", 17.6e-12)]
    device = join(join(s_of(line(2e-10, 50.8, 0.06)), s_of(ladder(low_pass))), s_of(line(2e-10, 50.6, 0.06)))
    m = np.empty((len(f), 4, 2))
    for port in range(2):
        near = join([0.03 * np.exp(-w * 1e-9)] * 4, s_of(line(4.9e-9, 50.1, 0.9)))
        far = join(s_of(line(4.9e-9, 49.9, 0.9)), [0.05 * np.exp(-w * 1e-9)] * 4)
        whole = join(join(near, device), far)
        for k, plane in enumerate((whole[0], whole[2])):
            noise = rng.standard_normal((4, len(f)))
            read = plane * (1 + 1e-4 * (noise[0] + 1j * noise[1])) + 1e-7 * (noise[2] + 1j * noise[3])
            m[:, 2 * port + k, 0], m[:, 2 * port + k, 1] = read.real, read.imag
    return m.astype(">f8").tobytes()


def read_block(client: Any, size: int) -> bytes:
    """Header and exact count, which every door does fast."""
    client.set_visa_attribute(pyvisa.constants.ResourceAttribute.termchar_enabled, False)
    digits = int(client.read_bytes(2)[1:])
    assert int(client.read_bytes(digits)) == size
    data = client.read_bytes(size + 1, chunk_size=size + 1)
    client.set_visa_attribute(pyvisa.constants.ResourceAttribute.termchar_enabled, True)
    return data[:-1]


def main(rounds: int) -> int:
    """Measure, print, and compare with the targets."""
    rows: list[tuple[str, str, int, float, float]] = [
        ("world", name, 0, median_ms(lambda name=name: load_bench(name, 1), rounds, time.process_time), 0.0)
        for name in BENCHES
    ]
    bench = load_bench("workshop", 1)
    bench.world.offer("HF-0001")
    bench.world.connect([(["jig-left", "unit", "jig-right"], [1, 2])])
    instrument, rng = bench.instruments[ANALYZER], np.random.default_rng(1)
    inside = pyvisa.ResourceManager(simulated_visa(bench.world, bench.instruments))
    outside = pyvisa.ResourceManager("@py")
    with SocketDoor(instrument) as plain_door, HislipDoor(instrument) as slip:
        clients = {
            "in process": inside.open_resource(ANALYZER),
            "socket": outside.open_resource(plain_door.resource),
            "HiSLIP": outside.open_resource(slip.resource),
        }
        for points in POINTS:
            f = np.geomspace(5e6, 1.2e9, points)
            yardstick = median_ms(lambda f=f: plain(f, rng), rounds, time.process_time)
            rows.append(("plain numpy", "", points, yardstick, 1.0))
            for door, client in clients.items():
                client.read_termination = client.write_termination = "\n"
                client.timeout = 20_000
                client.write(
                    f"*RST;FORM REAL,64;:SENS:FREQ:STAR 5E6;STOP 1.2E9;:SENS:SWE:SPAC LOG;POIN {points}"
                )
                client.write("SENS:BAND 1E3;:OUTP ON")

                def sweep(client: Any = client) -> None:
                    client.query("INIT;*OPC?")

                def read(client: Any = client, points: int = points) -> None:
                    client.write("TRAC? MATRIX")
                    read_block(client, points * 64)

                if door == "in process":
                    simulated_s = instrument.sweep_s  # type: ignore[attr-defined]
                    rows.append(("sweep", "", points, median_ms(sweep, rounds, time.process_time), yardstick))
                    print(f"{points} points: simulated {simulated_s:.2f} s, "
                          f"{simulated_s * 1e3 / rows[-1][3]:.0f} times the processor time")  # fmt: skip
                sweep()
                rows.append(("read", door, points, median_ms(read, rounds), yardstick))
        for client in clients.values():
            client.close()
    missed = 0
    print(f"{'what':<12} {'door':<11} {'points':>7} {'ms':>9} {'x plain':>8} {'target':>8}")
    for what, door, points, took, yardstick in rows:
        target = TARGETS_MS.get((what, door, points))
        ratio = f"{took / yardstick:8.2f}" if yardstick > 1.0 or what in ("sweep", "read") else " " * 8
        verdict = "" if target is None else f"{target:8.1f} {'met' if took <= target else 'MISSED'}"
        missed += target is not None and took > target
        print(f"{what:<12} {door:<11} {points:>7} {took:9.2f} {ratio} {verdict}")
    return int(missed > 0)


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 15))
