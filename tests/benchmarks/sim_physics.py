"""How fast the simulated physics is: ``python tests/benchmarks/sim_physics.py``.

Prints one line a figure and ends with code 1 if a limit is passed. Processor time, best of many.
"""

from __future__ import annotations

import statistics
import sys
import time
from collections.abc import Callable

import numpy as np

from sim_instruments.bench import load_bench
from sim_instruments.instruments.receivers import WorldReadings
from sim_instruments.parts import build

POINTS = 1601
SWEEP_MS, FASTER, WORLD_MS = 5.0, 200.0, 20.0
BENCHES = ("workshop", "amplifier")
NINE = {
    "kind": "filter", "shape": "chebyshev", "order": 9, "ripple": 0.1, "passes": "low", "edge": "200 MHz",
    "coil q": 140, "capacitor q": 900, "tolerance": "1 %",
}  # fmt: skip


def processor_ms(what: Callable[[], object], times: int = 60) -> tuple[float, float]:
    """Best and median processor time of a call in milliseconds."""
    seen = []
    for _ in range(times):
        start = time.process_time()
        what()
        seen.append((time.process_time() - start) * 1e3)
    return min(seen), statistics.median(seen)


def plain(f_hz: np.ndarray, generator: np.random.Generator) -> np.ndarray:
    """The same chain in plain numpy, S-domain, once for each driven port, with noise and nothing kept."""
    w = 2j * np.pi * f_hz

    def s_of(a: np.ndarray, b: np.ndarray, c: np.ndarray, d: np.ndarray) -> list[np.ndarray]:
        t = a + b / 50 + c * 50 + d
        return [(a + b / 50 - c * 50 - d) / t, 2 / t, 2 / t, (-a + b / 50 - c * 50 + d) / t]

    def line(delay: float, z: float, loss: float) -> list[np.ndarray]:
        g = loss / 8.686 * np.sqrt(f_hz / 1e9) + w * delay
        ch, sh = np.cosh(g), np.sinh(g)
        return s_of(ch, z * sh, sh / z, ch)

    def star(x: list[np.ndarray], y: list[np.ndarray]) -> list[np.ndarray]:
        r = 1 / (1 - x[3] * y[0])
        return [
            x[0] + x[1] * y[0] * x[2] * r,
            x[1] * y[1] * r,
            y[2] * x[2] * r,
            y[3] + y[2] * x[3] * y[1] * r,
        ]

    one = np.ones(len(f_hz), complex)
    a, b, c, d = one, 0 * one, 0 * one, one
    for k in range(9):
        z = 0.5 + w * 60e-9 if k % 2 else 0.1 + 1 / (w * 30e-12)
        if k % 2:
            b, d = a * z + b, c * z + d
        else:
            a, c = a + b / z, c + d / z
    chain = star(star(line(210e-12, 50.8, 0.06), s_of(a, b, c, d)), line(190e-12, 50.6, 0.06))
    boxes = [star([0.04 * one, one, 0.9 * one, 0.08 * one], line(4.9e-9, 50.1, 0.9)) for _ in (1, 2)]
    m = np.empty((len(f_hz), 2, 2), complex)
    for p in (0, 1):
        far = boxes[1 - p]
        seen = chain if p == 0 else [chain[3], chain[2], chain[1], chain[0]]
        whole = star(star(boxes[p], seen), [far[3], far[2], far[1], far[0]])
        m[:, p, p], m[:, 1 - p, p] = whole[0], whole[2] + 1e-6
    noise = generator.standard_normal((4, *m.shape))
    return np.asarray(m * (1 + 1e-4 * (noise[0] + 1j * noise[1])) + 1e-6 * (noise[2] + 1j * noise[3]))


def main() -> int:
    """Measure, print, judge."""
    bench = load_bench("workshop", 1)
    world = bench.world
    world.items = {**world.items, "ladder": build(NINE, world.draws / "ladder")}
    world.connect([(["jig-left", "ladder", "jig-right"], [1, 2])])
    analyzer = bench.instruments["GPIB0::16::INSTR"]
    readings = analyzer.readings  # type: ignore[attr-defined]
    assert isinstance(readings, WorldReadings)
    f_hz = np.linspace(5e6, 1.5e9, POINTS)

    def sweep() -> None:
        world.advance(5.0)  # the room changes from sweep to sweep, so that nothing can be kept for it
        readings.read(f_hz, 1e3, -10.0, 1, True)

    generator = np.random.default_rng(1)
    sweep()
    best, usual = processor_ms(sweep)
    bare, bare_usual = processor_ms(lambda: plain(f_hz, generator))
    worlds = {name: processor_ms(lambda name=name: load_bench(name, 1), 30)[1] for name in BENCHES}
    duration_ms = 2 * POINTS * (1.3 / 1e3 + 100e-6) * 1e3
    rows = [
        (f"sweep of {POINTS} points", usual, SWEEP_MS, "ms", usual < SWEEP_MS),
        ("faster than the sweep lasts by", duration_ms / usual, FASTER, "x", duration_ms / usual > FASTER),
        *((f"a world: {name}", ms, WORLD_MS, "ms", ms < WORLD_MS) for name, ms in worlds.items()),
    ]
    for name, value, limit, unit, met in rows:
        print(f"{name:34} {value:9.2f} {unit:3} limit {limit:g} {unit}  {'met' if met else 'NOT MET'}")
    print(f"best: sweep {best:.2f} ms")
    print(f"ratio to plain numpy: {usual / bare_usual:.2f} (plain {bare_usual:.2f} ms, best {bare:.2f} ms)")
    return 0 if all(row[-1] for row in rows) else 1


if __name__ == "__main__":
    sys.exit(main())
