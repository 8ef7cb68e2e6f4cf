"""A short coverage study: intervals of random benches hold the truth about as often as they say.

The long one, figure kind by figure kind, is ``tests/benchmarks/coverage_study.py``; this runs its code.
"""

from __future__ import annotations

import runpy
from pathlib import Path

import numpy as np
import pytest

STUDY = Path(__file__).parents[1] / "benchmarks" / "coverage_study.py"


@pytest.fixture(scope="module")
def study():
    """Names of the long study."""
    return runpy.run_path(str(STUDY))


@pytest.mark.slow
@pytest.mark.parametrize("which", ["filter in jig", "preselector", "pad"])
def test_intervals_hold_the_truth(study, which):
    outcomes, errors = [], []
    for seed in range(101, 111):
        for _, what, error in study["case"](seed, which, trials=150):
            if what in ("in", "out"):
                outcomes.append(what == "in")
                errors.append(error)
    # Ten benches: their figures hang together, so the share may well miss 95 % by a few points.
    assert np.mean(outcomes) >= 0.85
    assert 0.6 < np.sqrt(np.mean(np.square(errors))) < 1.4


def test_an_uncertainty_half_as_large_would_be_seen(study):
    found = [entry for seed in range(101, 107) for entry in study["case"](seed, "pad", trials=100)]
    beyond = [abs(error) > 1.96 / 2 for _, what, error in found if what in ("in", "out")]
    assert np.mean(beyond) > 0.15
