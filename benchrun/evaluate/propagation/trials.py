"""Trials in chunks, each with a generator of its own: the result does not depend on who computes what."""

from __future__ import annotations

import os
from collections.abc import Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np

from benchrun.evaluate.propagation.kernel import Kernel
from benchrun.evaluate.propagation.quantities import Quantity
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["Block", "Moments", "Trials", "generator"]

_CHUNK = 24_000
"""Points times draws of one chunk: planes of some 400 kB stay near the processor, and each of the hundred
or so calls that a chunk takes is worth its price."""
_NOISE_BLOCK = 1_000_000
"""Number of the stream for noise alone, far above those of the blocks."""
_WORKERS = max(1, min(4, os.cpu_count() or 1))


def generator(seed: int, block: int, chunk: int) -> np.random.Generator:
    """Chance of one chunk: a stream of its own for every seed, block and chunk."""
    return np.random.Generator(np.random.SFC64(np.random.SeedSequence([seed, block, chunk])))


@dataclass(slots=True, eq=False)
class Moments:
    """Sums over draws, added up in the order of the chunks.

    Parameters
    ----------
    count
        Draws so far.
    first, second
        Of each plane's departures from the nominal one: sums ``(2, f)`` of real and imaginary part, and
        ``(3, f)`` of their squares and product.
    """

    count: int
    first: dict[str, FloatArray]
    second: dict[str, FloatArray]

    def add(self, other: Moments) -> None:
        """Add another chunk."""
        self.count += other.count
        for own, new in ((self.first, other.first), (self.second, other.second)):
            for key, value in new.items():
                own[key] = own[key] + value if key in own else value

    def covariance(self, name: str) -> FloatArray:
        """2x2 covariance of real and imaginary part at each point, ``(f, 2, 2)``."""
        mean = self.first[name] / self.count
        rr, ii, ri = self.second[name] / self.count
        scale = self.count / max(self.count - 1, 1)
        rr, ii, ri = rr - mean[0] ** 2, ii - mean[1] ** 2, ri - mean[0] * mean[1]
        return np.asarray(scale * np.stack([np.stack([rr, ri], -1), np.stack([ri, ii], -1)], -2))


Block = tuple[FloatArray, Moments]
"""Values ``(m, n)`` of all quantities, and the sums."""


class Trials:
    """Everything that is run again and again.

    Parameters
    ----------
    kernel
        Draws to planes.
    nominal
        Planes ``(f,)`` without any draw.
    quantities
        What is followed, on the kernel's points.
    seed
        Of all draws.
    planes
        Whether covariances of all planes are wanted.
    """

    def __init__(
        self,
        kernel: Kernel,
        nominal: TwoPort | ComplexArray,
        quantities: Sequence[Quantity],
        seed: int = 0,
        planes: bool = True,
    ) -> None:
        self.kernel, self.nominal, self.seed = kernel, nominal, seed
        self.quantities, self.planes = tuple(quantities), planes
        self.chunk = max(1, _CHUNK // len(kernel.trail.f_hz))

    def block(self, number: int, trials: int) -> Block:
        """One block of trials."""
        sizes = [self.chunk] * (trials // self.chunk)
        if rest := trials % self.chunk:
            sizes.append(rest)

        def one(chunk: int) -> Block:
            chance = generator(self.seed, number, chunk)
            rows = self.kernel.draw(chance, sizes[chunk])
            return self.look(self.kernel.run(rows, chance if self.kernel.noisy else None))

        if _WORKERS == 1 or len(sizes) == 1:
            found = [one(chunk) for chunk in range(len(sizes))]
        else:
            with ThreadPoolExecutor(_WORKERS) as pool:  # numpy lets go of the interpreter while it computes
                found = list(pool.map(one, range(len(sizes))))
        total = Moments(0, {}, {})
        for _, moments in found:
            total.add(moments)
        return np.concatenate([values for values, _ in found]), total

    def look(self, data: TwoPort | ComplexArray) -> Block:
        """Take all quantities from planes ``(d, f)``."""
        moments = Moments(len(_first(data)), {}, {})
        if self.planes:
            for name in ("S11", "S12", "S21", "S22") if isinstance(data, TwoPort) else ("S11",):
                off = _plane(data, name) - _plane(self.nominal, name)
                re, im = off.real, off.imag
                moments.first[name] = np.stack([re.sum(0), im.sum(0)])
                moments.second[name] = np.stack(
                    [
                        np.einsum("df,df->f", re, re),
                        np.einsum("df,df->f", im, im),
                        np.einsum("df,df->f", re, im),
                    ]
                )
        return self.values(data), moments

    def values(self, data: TwoPort | ComplexArray) -> FloatArray:
        """Quantities alone, ``(d, n)``."""
        f_hz = self.kernel.trail.f_hz
        values = np.empty((len(_first(data)), len(self.quantities)))
        for n, quantity in enumerate(self.quantities):
            values[:, n] = quantity.take(f_hz, data)
        return values

    def noise_alone(self, draws: int) -> FloatArray:
        """Values of all quantities with more noise and nothing else, ``(draws, n)``."""
        chance, found = generator(self.seed, _NOISE_BLOCK, 0), list[FloatArray]()
        for first in range(0, draws, self.chunk):
            rows = np.zeros((min(self.chunk, draws - first), self.kernel.axes))
            found.append(self.values(self.kernel.run(rows, chance)))
        return np.concatenate(found)


def _plane(data: TwoPort | ComplexArray, name: str) -> ComplexArray:
    return data.parameter(name) if isinstance(data, TwoPort) else data


def _first(data: TwoPort | ComplexArray) -> ComplexArray:
    return data.s11 if isinstance(data, TwoPort) else data
