"""How long every figure takes, and how that grows with the points of the sweep.

Each figure is taken over nearly the whole sweep of one synthetic filter behind a line, at 201 and at
100 001 points, several times; the median counts. The growth is compared with the points' own: a figure
that costs a fixed part plus a part per point has a ratio below one.

Usage: python tests/benchmarks/rf_figures.py [REPEATS]
"""

from __future__ import annotations

import statistics
import sys
import time

import numpy as np

from benchrun.rf.figures import FIGURES
from benchrun.rf.twoport import TwoPort

FEW, MANY = 201, 100_001
TARGET_MS = 50.0
NEEDED = {
    "over": (5e6, 395e6), "aperture": 2e6, "drop": 10.0, "outer": 12.0, "velocity": 0.7, "distance": 2.0,
}  # fmt: skip


def grid(points: int) -> np.ndarray:
    """From one step upwards, so that the views over time stand on samples."""
    return 400e6 / points * np.arange(1, points + 1)


def filtered(f_hz: np.ndarray) -> TwoPort:
    """A tuned circuit at 150 MHz behind 1.2 m of line, which is the greatest reflection off resonance."""
    x = 15.0 * (f_hz / 150e6 - 150e6 / f_hz)
    turn = np.exp(-2j * np.pi * f_hz * 6e-9)
    s21 = 0.9 * turn / (1 + 1j * x)
    return TwoPort(0.3 * turn**2 + 0.01, s21, 0.9 * s21, 0.4j * turn**2)


def milliseconds(name: str, points: int, repeats: int) -> float:
    """Median time of one figure."""
    kind, f_hz = FIGURES[name], grid(points)
    network = filtered(f_hz)
    parameters = {
        key: NEEDED.get(key, parameter.default) if parameter.default is None else parameter.default
        for key, parameter in kind.parameters.items()
        if key not in ("at", "against", "within")
    }
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        kind.measure(f_hz, network, "at most", **parameters)
        times.append(time.perf_counter() - start)
    return 1e3 * statistics.median(times)


def main(repeats: int) -> int:
    """Print a line a figure; exit code 1 if one is too slow or grows faster than its points."""
    bad = 0
    print(f"{'figure':28}{FEW:>10} pt{MANY:>10} pt   growth per point")
    for name in sorted(n for n, kind in FIGURES.items() if kind.domain == "sweep"):
        few, many = milliseconds(name, FEW, repeats), milliseconds(name, MANY, repeats)
        growth = (many / few) / (MANY / FEW)
        wrong = many > TARGET_MS or growth > 1.5
        bad += wrong
        print(f"{name:28}{few:10.3f} ms{many:10.3f} ms{growth:10.3f}{'   TOO SLOW' if wrong else ''}")
    print(f"target: {TARGET_MS:g} ms at {MANY} points, growth at most linear; missed by {bad}")
    return 1 if bad else 0


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 9))
