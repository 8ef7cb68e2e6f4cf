"""How many bad units near the limit pass, and whether the predicted risk says so.

A pad is measured many times over by random benches (see ``coverage_study``). For each the limit is put where
the true value is just outside of it, from 0 to 2 U away, and the rule judges what was measured. Reported: the
share of such bad units that pass, the share that the program's own specific risks predicted, and the
statistical error.

Usage: python tests/benchmarks/escape_study.py [CASES [SEED]]
"""

from __future__ import annotations

import math
import sys
from multiprocessing import Pool

import coverage_study as study
import numpy as np

from benchrun.evaluate.propagation import trials as propagation_trials
from benchrun.evaluate.propagation.propagate import propagate
from benchrun.evaluate.propagation.quantities import Quantity, near
from benchrun.evaluate.propagation.trail import corrected, freed
from benchrun.rf.figures import FIGURES
from benchrun.uncertainty.decision import COVERAGE_FACTOR, Conclusion, Rule, conclude
from benchrun.uncertainty.montecarlo import Effort

FIGURES_JUDGED = (
    ("insertion loss", "at most", {"over": (160e6, 175e6), "trace": "S21"}),
    ("corner frequency", "at least", {"drop": 3.0, "edge": "upper", "trace": "S21"}),
    ("VSWR", "at most", {"over": (160e6, 175e6), "port": 1}),
    ("group delay", "at most", {"over": (160e6, 175e6), "aperture": 8e6, "trace": "S21"}),
)
RULES = (Rule(), Rule("guard band", 0.83), Rule("guard band", 1.0), Rule("guard band", 1.5))
OFFSETS = np.linspace(0.0, 2.0, 21)
"""How far outside the limit the true value is, in U."""


def errors(seed: int) -> list[tuple[float, float]]:
    """Error of each figure towards acceptance, and its U, in the figure's unit."""
    propagation_trials._WORKERS = 1
    trail, declared, truth = study.measure(seed, "filter in jig")
    nominal, found = freed(corrected(trail.terms, trail.unit, 1), trail.fixtures), list[tuple[float, float]]()
    asked, true = list[Quantity](), list[float]()
    for name, side, parameters in FIGURES_JUDGED:
        kind = FIGURES[name]
        value = float(kind.measure(trail.f_hz, nominal, side, **parameters).value)
        true.append(float(kind.measure(trail.f_hz, truth, side, **parameters).value))
        asked.append(Quantity(name, kind, side, parameters, value, near(trail.f_hz, kind, parameters)))
    spreads = propagate(trail, declared, asked, Effort(trials=400), seed).figures
    for (_, side, _), one, t in zip(FIGURES_JUDGED, spreads, true, strict=True):
        lucky = t - one.value if side == "at most" else one.value - t
        found.append((lucky, COVERAGE_FACTOR * one.departure()))
    return found


def main(cases: int, seed: int) -> int:
    """Print the table; exit code 1 if more than 2.5 % of bad units pass with w = U, beyond its error."""
    with Pool() as pool:
        found = np.array(pool.map(errors, range(seed, seed + cases), chunksize=4))
    print(f"{cases} benches, {len(FIGURES_JUDGED)} figures, bad units from 0 to 2 U outside the limit\n")
    print("| rule | passed at the limit | passed, 0 to 2 U outside | predicted | statistical error |")
    print("|---|---|---|---|---|")
    worst = 0.0
    for rule in RULES:
        passed, predicted = np.zeros((2, len(OFFSETS)))
        for lucky, expanded in found.reshape(-1, 2):
            for n, offset in enumerate(OFFSETS):
                # Limit at 0, "at most"; the unit truly lies offset U beyond it, and was read luckily.
                verdict = conclude(offset * expanded - lucky, 0.0, "at most", expanded, rule)
                passed[n] += verdict.conclusion is Conclusion.PASS
                predicted[n] += 0.5 * math.erfc(COVERAGE_FACTOR * (rule.factor + offset) / math.sqrt(2.0))
        total = len(found.reshape(-1, 2))
        # Figures of one bench hang together: benches count, not figures.
        error = math.sqrt(max(passed.mean() / total, 1.0 / cases / 100) / cases)
        shares = passed[0] / total, passed.mean() / total, predicted.mean() / total, error
        print(f"| {rule.text.split(' (')[0]} | {' | '.join(f'{100 * one:.2f} %' for one in shares)} |")
        if rule.factor == 1.0:
            worst = passed[0] / total - 2 * math.sqrt(0.025 / cases)
    return int(worst > 0.025)


if __name__ == "__main__":
    numbers = [int(text) for text in sys.argv[1:]]
    sys.exit(main(*(numbers + [1000, 20_001][len(numbers) :])))
