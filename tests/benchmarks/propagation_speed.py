"""How fast uncertainty is propagated: SOLT, correction, de-embedding, every figure of the harmonic filter.

Beside the wall time the table gives processor time (what it would be on an idle machine, over the cores), the
time of the random numbers alone, made by the same generators on as many threads, and the time of a loop over
scikit-rf for the same draws, extrapolated from a dozen.

Usage: python tests/benchmarks/propagation_speed.py
"""

from __future__ import annotations

import resource
import time
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from functools import partial
from typing import Any

import coverage_study as study
import numpy as np
import skrf
from skrf.calibration import TwelveTerm

from benchrun.evaluate.propagation import trials as propagation_trials
from benchrun.evaluate.propagation.influences import influences
from benchrun.evaluate.propagation.kernel import Kernel
from benchrun.evaluate.propagation.quantities import Quantity, near
from benchrun.evaluate.propagation.trail import Trail, corrected, freed
from benchrun.evaluate.propagation.trials import Trials, generator
from benchrun.paths import installed_sequences
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.files import load_model
from benchrun.sequence.models import Sequence
from benchrun.sequence.steps.judge import FigureLimit

SIZES = ((1601, 1000, 1.5), (201, 10_000, 2.0))
"""Points, draws, and the seconds that it should take at most on two cores."""
COMPLEX_PLANES = 14
LOOPS = 12


def quantities(trail: Trail) -> list[Quantity]:
    """Every figure that the installed sequence judges."""
    path = installed_sequences() / "harmonic-filter.yaml"
    judge: Any = load_model(path.read_bytes(), "sequence", Sequence).model.steps[-1]
    nominal, found = freed(corrected(trail.terms, trail.unit, 1), trail.fixtures), list[Quantity]()
    for limit in judge.limits:
        if isinstance(limit, FigureLimit):
            for side in limit.bounds:
                value = float(limit.kind.measure(trail.f_hz, nominal, side, **limit.parameters).value)
                points = near(trail.f_hz, limit.kind, limit.parameters)
                found.append(Quantity(limit.text, limit.kind, side, limit.parameters, value, points))
    return found


def timed(work: Callable[[], object], times: int = 3) -> tuple[float, float]:
    """Least wall and processor seconds of some runs."""
    walls, loads = list[float](), list[float]()
    for _ in range(times):
        wall, load = time.perf_counter(), time.process_time()
        work()
        walls.append(time.perf_counter() - wall)
        loads.append(time.process_time() - load)
    return min(walls), min(loads)


def random_numbers(chunks: int, rows: int, points: int) -> None:
    """As many normal draws as the propagation takes, and nothing else."""

    def one(chunk: int) -> None:
        chance = generator(1, 0, chunk)
        for _ in range(COMPLEX_PLANES):
            chance.standard_normal((rows, 2 * points))

    with ThreadPoolExecutor(propagation_trials._WORKERS) as pool:
        list(pool.map(one, range(chunks)))


def by_scikit_rf(trail: Trail) -> None:
    """One draw: solve, correct, take the jig out."""
    frequency = skrf.Frequency.from_f(trail.f_hz, unit="hz")

    def network(two: TwoPort) -> skrf.Network:
        return skrf.Network(frequency=frequency, s=two.matrix, z0=50.0)

    readings, ideals, measured = trail.basis.readings, [], []
    zero = np.zeros(len(trail.f_hz), np.complex128)
    for name in ("short", "open", "load"):
        gamma = np.asarray(trail.definitions[name])
        one, two = readings[f"{name} on port 1"], readings[f"{name} on port 2"]
        ideals.append(network(TwoPort(gamma, zero, zero, gamma)))
        measured.append(network(TwoPort(one.s11, zero, zero, two.s22)))
    thru = trail.definitions["thru"]
    assert isinstance(thru, TwoPort)
    ideals.append(network(thru))
    measured.append(network(readings["thru from port 1 to port 2"]))
    calibration = TwelveTerm(measured=measured, ideals=ideals, n_thrus=1)
    left, right = trail.fixtures[0]
    assert left is not None
    assert right is not None
    network(left).inv ** calibration.apply_cal(network(trail.unit)) ** network(right).inv


def main() -> None:
    """Print the table."""
    print(
        "| draws x points | wall | processor | random numbers alone: wall, processor | ratio of processor "
        "time | scikit-rf loop | ratio of wall time | memory |"
    )
    print("|---|---|---|---|---|---|---|---|")
    for points, draws, most in SIZES:
        trail, declared, _ = study.measure(1, "filter in jig", np.geomspace(5e6, 1.2e9, points))
        kernel = Kernel(trail, influences(trail, declared))
        still = kernel.run(np.zeros((1, kernel.axes)), None)
        assert isinstance(still, TwoPort)
        run = Trials(kernel, still.map(lambda p: p[0]), quantities(trail), 1)
        np.empty(30 << 20, np.uint8)  # as a calibration does, see there
        wall, load = timed(partial(run.block, 0, draws))
        alone = timed(partial(random_numbers, draws // run.chunk, run.chunk, points))
        loop = timed(partial(by_scikit_rf, trail), LOOPS)[0] * draws
        memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e3
        print(
            f"| {draws} x {points} | {wall:.2f} s (at most {most:g}) | {load:.2f} s | {alone[0]:.2f} s, "
            f"{alone[1]:.2f} s | {load / alone[1]:.1f} | {loop:.0f} s | {loop / wall:.0f} | {memory:.0f} MB |"
        )


if __name__ == "__main__":
    main()
