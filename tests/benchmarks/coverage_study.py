"""Do the 95 % intervals hold the truth? Random benches, kits, connections and units with known truth.

Each case is another specimen of the workshop's bench whose spreads are drawn too: analyzer, kit, jig, noise,
drift, leakage. It calibrates (SOLT), reads a unit, takes the jig out or has none, and propagates the bench's
own spreads as its declared sources. Then the true figure lies within the interval or it does not.

An interval is the reported value and 1.96 standard uncertainties either way; for decibels of one magnitude it
is taken in the magnitude. Not counted are figures that the program itself calls not resolvable (U as large as
the magnitude) or decided by noise (it says so); both are listed.

Usage: python tests/benchmarks/coverage_study.py [CASES [SEED]]
"""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import collections
import math
import sys
import tempfile
import time
from collections.abc import Mapping
from multiprocessing import Pool
from pathlib import Path
from typing import Any

import numpy as np
import yaml

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.propagation import trials as propagation_trials
from benchrun.evaluate.propagation.propagate import FigureSpread, propagate
from benchrun.evaluate.propagation.quantities import Quantity, near
from benchrun.evaluate.propagation.trail import Basis, Trail, corrected, freed
from benchrun.hookup import Connection, Hookup
from benchrun.paths import installed_sequences
from benchrun.rf.calibration import METHODS
from benchrun.rf.figures import FIGURES
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.files import load_model
from benchrun.sequence.kit import KitFile
from benchrun.uncertainty.montecarlo import Effort
from benchrun.uncertainty.sources import Sources
from sim_instruments import bench as simulated
from sim_instruments.bench import load_bench

WORKSHOP = Path(simulated.__file__).parent / "benches" / "workshop.yaml"
LOADER: Any = getattr(yaml, "CSafeLoader", yaml.SafeLoader)
DUMPER: Any = getattr(yaml, "CSafeDumper", yaml.SafeDumper)
ANALYZER = "GPIB0::16::INSTR"
S21 = {"trace": "S21"}
BAND = {"over": (160e6, 175e6)}
FILTER = [
    ("insertion loss", "at most", {**BAND, **S21}),
    ("insertion loss", "at most", {"at": 169e6, **S21}),
    ("corner frequency", "at most", {"drop": 3.0, "edge": "upper", **S21}),
    ("stop-band edge", "at most", {"drop": 40.0, "edge": "upper", **S21}),
    ("rejection", "at least", {"over": (338e6, 352e6), **S21}),
    ("return loss", "at least", {**BAND, "port": 1}),
    ("return loss", "at least", {"at": 165e6, "port": 2}),
    ("VSWR", "at most", {**BAND, "port": 2}),
    ("mismatch loss", "at most", {**BAND, "port": 1}),
    ("resistance", "at most", {"at": 165e6, "port": 1, "reference": 50.0}),
    ("reactance", "at most", {"at": 165e6, "port": 1, "reference": 50.0}),
    ("impedance", "at most", {"at": 165e6, "port": 1, "reference": 50.0}),
    ("ripple", "at most", {"over": (20e6, 175e6), **S21}),
    ("flatness", "at most", {"over": (20e6, 175e6), **S21}),
    ("slope", "at most", {"over": (20e6, 175e6), **S21}),
    ("group delay", "at most", {**BAND, "aperture": 8e6, **S21}),
    ("group delay variation", "at most", {**BAND, "aperture": 8e6, **S21}),
    ("phase", "at most", {"at": 169e6, **S21}),
    ("phase linearity", "at most", {"over": (20e6, 175e6), **S21}),
    ("electrical length", "at most", {"over": (20e6, 120e6), **S21}),
]
PRESELECTOR = [
    ("insertion loss", "at most", {"at": 169.4e6, **S21}),
    ("bandwidth", "at most", {"drop": 3.0, **S21}),
    ("centre frequency", "at most", {"drop": 3.0, **S21}),
    ("shape factor", "at most", {"drop": 3.0, "outer": 20.0, **S21}),
    ("loaded Q", "at most", {"drop": 3.0, **S21}),
    ("rejection", "at least", {"over": (140e6, 150e6), **S21}),
    ("return loss", "at least", {"over": (167e6, 172e6), "port": 1}),
    ("VSWR", "at most", {"over": (167e6, 172e6), "port": 2}),
    ("ripple", "at most", {"over": (166e6, 173e6), **S21}),
    ("group delay variation", "at most", {"over": (167e6, 172e6), "aperture": 1e6, **S21}),
]
PAD = [
    ("insertion loss", "at most", {"at": 500e6, **S21}),
    ("slope", "at most", {"over": (10e6, 1e9), **S21}),
    ("phase", "at most", {"at": 900e6, **S21}),
    ("electrical length", "at most", {"over": (10e6, 1e9), **S21}),
    ("resistance", "at most", {"at": 100e6, "port": 1, "reference": 50.0}),
]
UNITS: Mapping[str, tuple[str, bool, Any, list[tuple[str, str, dict[str, Any]]]]] = {
    "filter in jig": ("HF", True, np.geomspace(5e6, 1.2e9, 161), FILTER),
    "filter": ("HF", False, np.geomspace(5e6, 1.2e9, 161), FILTER),
    "preselector": ("PS", False, np.linspace(135e6, 205e6, 141), PRESELECTOR),
    "pad in jig": ("PD", True, np.linspace(10e6, 1e9, 67), PAD),
    "pad": ("PD", False, np.linspace(10e6, 1e9, 67), PAD),
}
"""Serial numbers, whether in the jig, grid, figures."""
BANDWIDTH_HZ, POWER_DBM = 100.0, -10.0
CONNECT_S, SWING_K, HEATING_S, WANDER_S = 25.0, 0.3, 2400.0, (2100.0, 5300.0, 14000.0)
"""What the simulated world does by itself: see its ``world`` and ``ageing``."""
JOINT = 4e-4
SORTED = 0.9594
"""Standard deviation of a normal spread cut at two sigma, as the simulated world draws its parts."""


def another_bench(seed: int) -> tuple[dict[str, Any], dict[str, Any], dict[str, float]]:
    """Bench and kit descriptions with spreads of their own, and the sizes drawn."""
    chance = np.random.default_rng([seed, 77])

    def factor() -> float:
        return float(np.exp(chance.uniform(np.log(0.5), np.log(2.0))))

    spec = yaml.load(WORKSHOP.read_text(encoding="utf-8"), Loader=LOADER)
    kit_path = installed_sequences() / "kits" / "n50-workshop.yaml"
    kit = yaml.load(kit_path.read_text(encoding="utf-8"), Loader=LOADER)
    sizes = {
        "L0": 1e-12 * factor(), "C0": 1e-15 * factor(), "delay": 0.1e-12 * factor(),
        "resistance": 0.25 * factor(), "inductance": 3e-12 * factor(), "jig delay": 0.05e-12 * factor(),
        "jig impedance": 0.03 * factor(), "launch": 2e-15 * factor(), "noise": -152.0 + chance.uniform(-6, 6),
        "trace": 0.0015 * factor(), "wander": 0.002 * factor(), "isolation": 116.0 + chance.uniform(-6, 6),
    }  # fmt: skip
    items, doubts = spec["items"], kit["standards"]
    items["short"]["spread"] = {"polynomial": sizes["L0"], "delay": sizes["delay"]}
    items["open"]["spread"] = {"polynomial": sizes["C0"], "delay": sizes["delay"]}
    items["load"]["spread"] = {"resistance": sizes["resistance"], "inductance": sizes["inductance"]}
    items["thru"]["spread"] = {"delay": sizes["delay"]}
    l0, c0, delay, ohm, henry = (
        f"{SORTED * sizes[name]:.6e} {unit}"
        for name, unit in (
            ("L0", "H"),
            ("C0", "F"),
            ("delay", "s"),
            ("resistance", "ohm"),
            ("inductance", "H"),
        )
    )
    doubts["short"]["uncertainty"] = {"L0": l0, "delay": delay}
    doubts["open"]["uncertainty"] = {"C0": c0, "delay": delay}
    doubts["load"]["uncertainty"] = {"resistance": ohm, "inductance": henry}
    doubts["thru"]["uncertainty"] = {"delay": delay}
    for half in ("jig-left", "jig-right"):
        items[half]["spread"] = {
            "delay": sizes["jig delay"], "impedance": sizes["jig impedance"], "launch": sizes["launch"],
        }  # fmt: skip
    receivers = spec["instruments"][ANALYZER]["receivers"]
    receivers.update(
        {
            "directivity": f"{chance.uniform(24, 34):.2f} dB",
            "source match": f"{chance.uniform(18, 28):.2f} dB",
            "load match": f"{chance.uniform(18, 28):.2f} dB",
            "isolation": f"{sizes['isolation']:.3f} dB",
            "noise": f"{sizes['noise']:.3f} dBm",
            "trace noise": f"{sizes['trace']:.6f} dB",
        }
    )
    receivers["drift"]["size"] = f"{sizes['wander']:.6f} dB"
    return spec, kit, sizes


def sources(sizes: Mapping[str, float], times_s: list[float]) -> Sources:
    """The bench's own spreads as its declared sources; slow changes as far as they go in this session."""

    def share(period_s: float) -> float:
        turns = np.exp(2j * np.pi * np.array(times_s) / period_s)
        return float(0.5 * (1.0 - abs(turns.mean()) ** 2))

    wander = sizes["wander"] * math.sqrt(2.0 / 3.0 * sum(share(period) for period in WANDER_S))
    return Sources.from_mapping(
        {
            "noise": {"floor": f"{sizes['noise']:.4f} dBm", "trace": f"{sizes['trace']:.8f} dB"},
            "linearity": {"deviation": "0.0004 dB"},
            "drift": {
                "per hour": f"{wander:.8f} dB", "over": "1 h", "per kelvin": "0.0005 dB",
                "delay per kelvin": "98 fs", "room": f"{SWING_K * math.sqrt(share(HEATING_S)):.6f} degC",
            },
            "connector": {"repeatability": f"{-20 * math.log10(JOINT * SORTED):.5f} dB"},
            "isolation": {"leakage": f"{sizes['isolation']:.4f} dB", "distribution": "normal"},
            "fixture": {
                "delay": f"{SORTED * sizes['jig delay']:.6e} s",
                "impedance": f"{SORTED * sizes['jig impedance']:.6f} ohm",
                "launch": f"{SORTED * sizes['launch']:.6e} F",
            },
        }
    )  # fmt: skip


def measure(seed: int, which: str, grid: Any = None) -> tuple[Trail, Sources, TwoPort]:
    """One case: what was done, what is declared, and the truth."""
    letters, jig, own_grid, _ = UNITS[which]
    f_hz = own_grid if grid is None else grid
    spec, kit_spec, sizes = another_bench(seed)
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "bench.yaml"
        path.write_text(yaml.dump(spec, Dumper=DUMPER), encoding="utf-8")
        bench = load_bench(str(path), seed)
    kit = load_model(yaml.dump(kit_spec, Dumper=DUMPER).encode(), "kit", KitFile).model.build()
    analyzer, world, times = bench.instruments[ANALYZER], bench.world, list[float]()

    def read(hookup: Hookup) -> TwoPort:
        world.connect([(c.items, c.ports) for c in hookup.connections])
        world.advance(2 * len(f_hz) * (1.3 / BANDWIDTH_HZ + 1e-4))
        times.append(world.time_s)
        return TwoPort.of(analyzer.readings.read(f_hz, BANDWIDTH_HZ, POWER_DBM, 1, True))

    method = METHODS["SOLT"]
    hookups = method.required((1, 2))
    readings = {hookup.text: read(hookup) for hookup in hookups}
    world.offer(f"{letters}-{1000 + seed % 7000:04d}")
    unit = Hookup((Connection(("jig-left", "unit", "jig-right") if jig else ("unit",), (1, 2)),))
    raw = read(unit)
    declared = sources(sizes, times)
    noise = declared.noise(BANDWIDTH_HZ, POWER_DBM, 1)
    basis = Basis(method, (1, 2), kit, hookups, readings, noise)
    definitions = basis.definitions(f_hz)
    terms = method.solve((1, 2), definitions, readings)
    halves = tuple(TwoPort.of(bench.fixtures[name].matrix(f_hz)) for name in ("jig-left", "jig-right"))
    fixtures = ((halves[0], halves[1]),) if jig else ()
    trail = Trail(f_hz, basis, terms, raw, unit, noise, fixtures, definitions)
    return trail, declared, TwoPort.of(world.truth(f_hz))


def holds(figure: FigureSpread, sense: int, truth: float) -> str:
    """``"in"``, ``"out"``, or why it is not counted."""
    standard = figure.departure(sense)
    if not math.isfinite(standard) or (sense and 2.0 * standard >= 1.0):
        return "not resolvable"
    if figure.noisy:
        return "decided by noise"
    off = truth - figure.value
    if sense:
        off = 10.0 ** (sense * off / 20.0) - 1.0
    return "in" if abs(off) <= 1.96 * standard else "out"


def case(seed: int, which: str, trials: int = 400) -> list[tuple[str, str, float]]:
    """Figure kind, what became of its interval, and the error in standard uncertainties."""
    trail, declared, truth = measure(seed, which)
    f_hz, nominal = trail.f_hz, freed(corrected(trail.terms, trail.unit, 1), trail.fixtures)
    asked, true = list[Quantity](), list[float]()
    for name, side, parameters in UNITS[which][3]:
        kind = FIGURES[name]
        try:
            value = float(kind.measure(f_hz, nominal, side, **parameters).value)
            true.append(float(kind.measure(f_hz, truth, side, **parameters).value))
        except InvalidMeasurement:
            continue
        asked.append(Quantity(name, kind, side, parameters, value, near(f_hz, kind, parameters)))
    figures = propagate(trail, declared, asked, Effort(trials=trials), seed).figures
    return [
        (one.name, holds(one, q.kind.sense, t), (one.value - t) / one.departure())
        for one, q, t in zip(figures, asked, true, strict=True)
    ]


def _one(job: tuple[int, str]) -> tuple[str, list[tuple[str, str, float]]]:
    propagation_trials._WORKERS = 1  # the cases themselves run side by side
    return job[1], case(*job)


def main(cases: int, seed: int) -> int:
    """Print the table; exit code 1 if a figure kind lies outside 93.5 to 96.5 %."""
    start = time.perf_counter()
    jobs = [(seed + n, list(UNITS)[n % len(UNITS)]) for n in range(cases)]
    counts: dict[tuple[str, str], collections.Counter[str]] = collections.defaultdict(collections.Counter)
    errors: dict[tuple[str, str], list[float]] = collections.defaultdict(list)
    with Pool() as pool:
        for which, found in pool.imap_unordered(_one, jobs, chunksize=4):
            for name, what, error in found:
                key = name, "de-embedded" if "jig" in which else "plain"
                counts[key][what] += 1
                if what in ("in", "out"):
                    errors[key].append(error)
    print("| figure | | held | of | share | not resolvable | decided by noise | rms error / u |")
    print("|---|---|---|---|---|---|---|---|")
    bad = 0
    for key in sorted(counts):
        c = counts[key]
        total = c["in"] + c["out"]
        share = 100.0 * c["in"] / total if total else math.nan
        bad += not 93.5 <= share <= 96.5
        rms = float(np.sqrt(np.mean(np.square(errors[key])))) if total else math.nan
        print(
            f"| {key[0]} | {key[1]} | {c['in']} | {total} | {share:.1f} % | {c['not resolvable']} | "
            f"{c['decided by noise']} | {rms:.2f} |"
        )
    print(f"\n{cases} benches in {time.perf_counter() - start:.0f} s; rows outside 93.5 to 96.5 %: {bad}")
    return int(bad > 0)


if __name__ == "__main__":
    numbers = [int(text) for text in sys.argv[1:]]
    sys.exit(main(*(numbers + [2500, 1][len(numbers) :])))
