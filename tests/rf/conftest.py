"""Analyzers with errors, and devices, made up from a seed: truth that the corrections must find again."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from benchrun.rf.terms import Direction, TwelveTerms
from benchrun.rf.twoport import ComplexArray, TwoPort


def disk(generator: np.random.Generator, points: int, radius: float) -> ComplexArray:
    """Complex numbers of at most ``radius``, ``(points,)``."""
    size, angle = generator.uniform(0.0, radius, points), generator.uniform(0.0, 2 * np.pi, points)
    return np.asarray(size * np.exp(1j * angle))


def ring(generator: np.random.Generator, points: int, low: float, high: float) -> ComplexArray:
    """Complex numbers of a magnitude between ``low`` and ``high``, ``(points,)``."""
    return np.asarray(
        generator.uniform(low, high, points) * np.exp(2j * np.pi * generator.uniform(size=points))
    )


@pytest.fixture
def random_terms() -> Callable[..., TwelveTerms]:
    """Make an analyzer no worse than any bench has: 14 dB directivity, 10 dB match, tracking within 6 dB."""

    def make(seed: int, points: int = 11, isolation: float = 0.0) -> TwelveTerms:
        g = np.random.default_rng(seed)

        def direction() -> Direction:
            return Direction(
                disk(g, points, 0.2),
                disk(g, points, 0.3),
                ring(g, points, 0.5, 1.2),
                disk(g, points, 0.3),
                ring(g, points, 0.5, 1.2),
                disk(g, points, isolation),
            )

        return TwelveTerms(direction(), direction())

    return make


@pytest.fixture
def random_device() -> Callable[..., TwoPort]:
    """Make a device of any reflection and transmission up to 0.9, not reciprocal."""

    def make(seed: int, points: int = 11) -> TwoPort:
        g = np.random.default_rng(seed + 10_000)
        return TwoPort(*(disk(g, points, 0.9) for _ in range(4)))

    return make
