"""Chance, by name: the same seed and the same name give the same draw, in whatever order they are asked."""

from __future__ import annotations

import zlib

import numpy as np

__all__ = ["Draws"]


class Draws:
    """Independent random values under names.

    Parameters
    ----------
    seed
        Of the world.
    path
        Names so far; ``draws / "standard" / "open"`` goes deeper.

    Examples
    --------
    >>> Draws(1).normal("a", 1.0) == Draws(1).normal("a", 1.0)
    True
    >>> Draws(1).normal("a", 1.0) == Draws(2).normal("a", 1.0)
    False
    """

    def __init__(self, seed: int, path: tuple[str, ...] = ()) -> None:
        self.seed = seed
        self.path = path

    def __truediv__(self, name: object) -> Draws:
        return Draws(self.seed, (*self.path, str(name)))

    def generator(self, name: str = "") -> np.random.Generator:
        """A generator of its own."""
        key = zlib.crc32("/".join((*self.path, name)).encode())
        return np.random.default_rng([self.seed, key])

    def normal(self, name: str, sigma: float, clip: float = 2.0) -> float:
        """Normal about zero, cut at ``clip`` sigma: parts beyond are sorted out by their maker."""
        return float(np.clip(self.generator(name).standard_normal(), -clip, clip)) * sigma

    def uniform(self, name: str, low: float, high: float) -> float:
        """Uniform between two values."""
        return float(self.generator(name).uniform(low, high))

    def phase(self, name: str) -> complex:
        """A unit phasor of random angle."""
        return complex(np.exp(2j * np.pi * self.generator(name).random()))
