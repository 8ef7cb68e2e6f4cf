"""What a row of parts and joints is between two ports: joined part by part, levels followed on the way."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from sim_instruments.hands import Joint
from sim_instruments.parts import Part, Surroundings
from sim_instruments.waves import (
    Matrix,
    Plane,
    Real,
    both,
    chain,
    flip,
    from_abcd,
    join,
    seen_through,
    thru,
    two,
)

__all__ = ["between", "joint_matrix", "open_end"]


def open_end(f_hz: Real) -> Plane:
    """An open connector: fringing capacitance and a little radiation (common practice)."""
    y = 1j * 2 * np.pi * f_hz * 45e-15 * 50.0 + 1e-4 * (f_hz / 1e9) ** 2
    return np.asarray((1 - y) / (1 + y))


def joint_matrix(f_hz: Real, joint: Joint) -> Matrix:
    """A small lossless step, growing with frequency; a loose one has a contact resistance besides."""
    r = np.minimum(abs(joint.size) * f_hz / 1e9, 0.9)
    through = np.sqrt(1 - r**2) + 0j
    step = np.asarray(1j * r * joint.angle)
    m = two(step, through, through, -np.conj(step))
    if joint.contact_ohm:
        one, zero = np.ones(len(f_hz), np.complex128), np.zeros(len(f_hz), np.complex128)
        m = join(m, from_abcd(one, np.full(len(f_hz), joint.contact_ohm + 0j), zero, one))
    return m


def between(
    f_hz: Real,
    rows: Sequence[tuple[tuple[int, ...], Sequence[Part], Sequence[Matrix]]],
    around: Surroundings,
    power_dbm: float | Real | None = None,
    driven: int = 1,
) -> Matrix:
    """S-parameters between ports 1 and 2, ``(f, 2, 2)``.

    Parameters
    ----------
    f_hz
        ``(f,)``.
    rows
        For each link its ports, its parts, and its joints in order (none: ideal ones).
    around
        What the parts feel.
    power_dbm, driven
        Level and port of the wave that comes in; none: low.
    """
    ends: dict[int, Plane] = {}
    for ports, parts, made in rows:
        joints = made or [thru(len(f_hz))] * (len(parts) + 1)
        if len(ports) == 2:
            level = power_dbm if driven == ports[0] else None
            row = [joints[0]]
            for part, joint in zip(parts, joints[1:], strict=True):
                row += [_driven(f_hz, part, around, level, row), joint]
            whole = chain(*row)
            return whole if ports == (1, 2) else flip(whole)
        *before, last = parts
        m = last.matrix(f_hz, around)
        gamma = m[:, 0, 0] if last.ports == 1 else seen_through(m, open_end(f_hz))
        for part, joint in zip(reversed(before), reversed(joints[1 : len(parts)]), strict=True):
            gamma = seen_through(join(part.matrix(f_hz, around), joint), gamma)
        ends[ports[0]] = seen_through(joints[0], gamma)
    return both(*(ends[port] if port in ends else open_end(f_hz) for port in (1, 2)))


def _driven(
    f_hz: Real, part: Part, around: Surroundings, power_dbm: float | Real | None, row: list[Matrix]
) -> Matrix:
    """A part under the wave that reaches it; what it sends back is small and not followed again."""
    if power_dbm is None or part.gain_factor is None:
        return part.matrix(f_hz, around)
    arriving = chain(*row)[:, 1, 0]
    return part.driven(f_hz, around, power_dbm + 20 * np.log10(np.abs(arriving) + 1e-30))
