"""When a fault happens."""

from __future__ import annotations

import zlib
from dataclasses import dataclass

import numpy as np

__all__ = ["When"]


@dataclass
class When:
    """Told at each occasion; says whether the fault happens.

    Parameters
    ----------
    name
        Of the fault: two faults of one seed go their own ways.
    after
        Occasions that pass first.
    probability
        At each occasion from then on.
    seed
        Of chance.
    once
        It happens one time only.

    Examples
    --------
    >>> when = When("no answer", after=1, once=True)
    >>> [when(), when(), when()]
    [False, True, False]
    """

    name: str
    after: int = 0
    probability: float = 1.0
    seed: int = 0
    once: bool = False

    def __post_init__(self) -> None:
        if self.after < 0 or not 0.0 <= self.probability <= 1.0:
            raise ValueError(
                f"a fault comes after 0 or more occasions with a probability from 0 to 1, not after "
                f"{self.after} with {self.probability:g}"
            )
        self.generator = np.random.default_rng([self.seed, zlib.crc32(self.name.encode())])
        self.seen = self.happened = 0

    def __call__(self) -> bool:
        """Count an occasion."""
        self.seen += 1
        if self.seen <= self.after or (self.once and self.happened):
            return False
        if self.probability < 1.0 and self.generator.random() >= self.probability:
            return False
        self.happened += 1
        return True
