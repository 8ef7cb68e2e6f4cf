"""What many draws of a calibration cost: solve, correct and de-embed, against looping scikit-rf.

1000 draws of 1601 points, a new noise on every reading of every draw, in chunks that stay in the
processor's cache; mean and variance are kept, as an uncertainty needs them. Both are
timed in this one run; scikit-rf on a few draws, since it takes the same time for each.

Usage: python tests/benchmarks/rf_kernel.py [DRAWS [POINTS]]
"""

from __future__ import annotations

import os
import resource
import sys
import time
from collections.abc import Callable, Mapping
from concurrent.futures import ThreadPoolExecutor
from typing import Any

import numpy as np
import skrf
from skrf.calibration import TRL, TwelveTerm

from benchrun.hookup import Hookup
from benchrun.rf.calibration import METHODS, define
from benchrun.rf.calibration.eight_terms import EightTerms
from benchrun.rf.calibration.method import Definitions
from benchrun.rf.deembedding.halves import without
from benchrun.rf.kit import Kit, Offset, Standard
from benchrun.rf.terms import OnePortTerms
from benchrun.rf.twoport import TwoPort

TARGET_S, TARGET_RATIO, TARGET_MB = 0.6, 100.0, 300.0
NOISE = 1e-4
CHUNK_BYTES = 200_000
"""Of one plane: 7 draws of 1601 points."""
USED = {
    "SOLT": {"short": 1, "open": 1, "load": 1, "thru": 2},
    "TRL": {"short": 1, "thru": 2, "line": 2},
}
"""Ports of each standard."""


class Setting:
    """A made-up analyzer, its readings without noise, and a fixture."""

    def __init__(self, method: str, points: int) -> None:
        self.method, self.points = METHODS[method], points
        self.f_hz = np.linspace(1e9, 6e9, points)
        self.kit = Kit(
            "made up",
            {
                "short": Standard("short", Offset(31e-12)),
                "open": Standard("open", Offset(29e-12), capacitance=(50e-15, 0, 0, 0)),
                "load": Standard("load"),
                "thru": Standard("thru"),
                "line": Standard("line", Offset(1 / 14e9)),
            },
        )
        w = self.f_hz / 6e9
        boxes = [
            OnePortTerms(0.05 * np.exp(-2j * w * k), 0.1 * np.exp(-3j * w), 0.9 * np.exp(-9j * w * k))
            for k in (1, 2)
        ]
        self.analyzer = EightTerms(boxes[0], boxes[1], np.exp(-4j * w))
        e = np.exp(-2j * np.pi * self.f_hz * 100e-12)
        self.half = TwoPort(0.05 * e, 0.95 * e, 0.95 * e, 0.02 * e)
        unit = TwoPort(0.1 * e, 0.8 * e, 0.8 * e, 0.2 * e)
        self.raw = self.analyzer.embed(self.half @ unit @ self.half.flipped())
        self.definitions: Definitions = define(self.kit, self.method.takes(), self.f_hz)
        self.used: Mapping[str, int] = USED[method]
        self.readings = self._readings()

    def _readings(self) -> dict[str, TwoPort]:
        found = {}
        for name, ports in self.used.items():
            truth: Any = self.definitions[name]
            if ports == 2:
                found[Hookup.of(name, 1, 2).text] = self.analyzer.embed(truth)
            else:
                zero = np.zeros(self.points, complex)
                both = self.analyzer.embed(TwoPort(truth, zero, zero, truth))
                found[Hookup.of(name, 1).text] = found[Hookup.of(name, 2).text] = both
        return found


class Noise:
    """Readings with noise; only the planes that a method looks at are drawn."""

    def __init__(self, setting: Setting, draws: int, seed: int = 0) -> None:
        self._random = np.random.Generator(np.random.SFC64([1, seed]))
        self._buffer = np.empty((draws, setting.points, 2))
        self._setting = setting

    def plane(self, nominal: np.ndarray, draws: int) -> np.ndarray:
        """``(draws, points)``."""
        buffer = self._buffer[:draws]
        self._random.standard_normal(out=buffer)
        buffer *= NOISE
        return np.asarray(buffer.view(np.complex128)[..., 0] + nominal)

    def readings(self, draws: int) -> dict[str, TwoPort]:
        """Of all standards."""
        setting, found = self._setting, {}
        for text, two in setting.readings.items():
            if " and " in text or "from" in text:
                found[text] = two.map(lambda p: self.plane(p, draws))
            elif text.endswith("1"):
                found[text] = TwoPort(self.plane(two.s11, draws), two.s12, two.s21, two.s22)
            else:
                found[text] = TwoPort(two.s11, two.s12, two.s21, self.plane(two.s22, draws))
        return found


def _share(setting: Setting, seed: int, draws: int) -> tuple[list[np.ndarray], list[np.ndarray]]:
    """Sums and sums of squares of the unit over some draws."""
    chunk = max(1, CHUNK_BYTES // (16 * setting.points))
    noise, half, other = Noise(setting, chunk, seed), setting.half, setting.half.flipped()
    total = [np.zeros(setting.points, complex) for _ in range(4)]
    square = [np.zeros(setting.points) for _ in range(4)]
    for first in range(0, draws, chunk):
        count = min(chunk, draws - first)
        terms = setting.method.solve((1, 2), setting.definitions, noise.readings(count))
        raw = setting.raw.map(lambda p, n=count: noise.plane(p, n))
        unit = without(terms.correct(raw), half, other)  # type: ignore[arg-type]
        for k, plane in enumerate(unit.planes):
            total[k] += plane.sum(axis=0)
            square[k] += np.einsum("df,df->f", plane.real, plane.real)
            square[k] += np.einsum("df,df->f", plane.imag, plane.imag)
    return total, square


def ours(setting: Setting, draws: int) -> tuple[float, TwoPort, TwoPort]:
    """Seconds, mean and standard deviation of the unit; one thread a processor, up to two."""
    workers = min(2, os.cpu_count() or 1)
    shares = [draws // workers + (k < draws % workers) for k in range(workers)]
    start = time.perf_counter()
    with ThreadPoolExecutor(workers) as pool:  # numpy lets go of the interpreter while it works
        parts = list(pool.map(lambda k: _share(setting, k, shares[k]), range(workers)))
    seconds = time.perf_counter() - start
    mean = [sum(total[k] for total, _ in parts) / draws for k in range(4)]
    power = [sum(square[k] for _, square in parts) / draws for k in range(4)]
    spread = [np.sqrt(np.maximum(p - np.abs(m) ** 2, 0.0)) + 0j for p, m in zip(power, mean, strict=True)]
    return seconds, TwoPort(*mean), TwoPort(*spread)


def theirs(setting: Setting, draws: int) -> float:
    """Seconds for one draw, by scikit-rf; making the noise is not counted."""
    noise, frequency = Noise(setting, 1), skrf.Frequency.from_f(setting.f_hz, unit="hz")

    def network(two: TwoPort) -> skrf.Network:
        return skrf.Network(frequency=frequency, s=two.map(lambda p: p.reshape(-1)).matrix)

    def one(plane: Any) -> skrf.Network:
        zero = np.zeros_like(plane)
        return network(TwoPort(plane, zero, zero, plane))

    half, other = network(setting.half), network(setting.half.flipped())
    ideals = [
        network(setting.definitions[n]) if ports == 2 else one(setting.definitions[n])  # type: ignore[arg-type]
        for n, ports in setting.used.items()
    ]
    seconds = 0.0
    for _ in range(draws):
        readings = {k: two.map(lambda p: p.reshape(-1)) for k, two in noise.readings(1).items()}
        raw = network(setting.raw.map(lambda p: noise.plane(p, 1)))
        measured = []
        for name, ports in setting.used.items():
            if ports == 2:
                measured.append(network(readings[Hookup.of(name, 1, 2).text]))
            else:
                a, b = (readings[Hookup.of(name, p).text] for p in (1, 2))
                measured.append(network(TwoPort(a.s11, 0 * a.s11, 0 * a.s11, b.s22)))
        start = time.perf_counter()
        if setting.method.name == "SOLT":
            calibration: Any = TwelveTerm(measured=measured, ideals=ideals, n_thrus=1)
        else:
            order = (1, 0, 2)  # thru, reflect, line
            zero = skrf.Network(frequency=frequency, s=np.zeros(setting.points))
            calibration = TRL(
                measured=[measured[k] for k in order],
                ideals=[ideals[k] for k in order],
                switch_terms=(zero, zero),
            )
        _ = half.inv ** calibration.apply_cal(raw) ** other.inv
        seconds += time.perf_counter() - start
    return seconds / draws


def _random_ns() -> float:
    """Nanoseconds for one normal number: tells a busy machine from a quiet one."""
    random, buffer = np.random.Generator(np.random.SFC64(1)), np.empty(10_000)
    start = time.perf_counter()
    for _ in range(100):
        random.standard_normal(out=buffer)
    return (time.perf_counter() - start) * 1e3


def peak_mb() -> float:
    """Greatest resident memory of this process so far."""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0


def main(arguments: list[str], say: Callable[[str], None] = print) -> int:
    """Time both and compare with the targets."""
    draws = int(arguments[0]) if arguments else 1000
    points = int(arguments[1]) if len(arguments) > 1 else 1601
    # The allocator keeps what it frees from here on; see benchrun.evaluate.steps.calibrate.
    np.empty(30 << 20, np.uint8)
    good = True
    say(f"this machine, now: {_random_ns():.1f} ns for a random number; a quiet one takes about 7")
    for name in USED:
        setting = Setting(name, points)
        ours(setting, 20)
        before = peak_mb()
        busy = time.process_time()
        seconds = min(ours(setting, draws)[0] for _ in range(3))
        busy = (time.process_time() - busy) / 3
        grown = peak_mb() - before
        each = theirs(setting, 4)
        ratio = each * draws / seconds
        allowed = TARGET_S * draws * points / (1000 * 1601)
        good = good and seconds <= allowed and ratio >= TARGET_RATIO and peak_mb() < TARGET_MB
        say(
            f"{name}: {draws} draws x {points} points in {seconds:.3f} s (at most {allowed:.3f}), "
            f"{busy:.3f} s of processor time; scikit-rf "
            f"{each * 1e3:.1f} ms a draw: {ratio:.0f} times slower (at least {TARGET_RATIO:.0f}); memory "
            f"{peak_mb():.0f} MB (below {TARGET_MB:.0f}), {grown:.0f} MB of it for the draws"
        )
    say("met" if good else "MISSED")
    return 0 if good else 1


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
