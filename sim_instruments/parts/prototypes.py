"""Low-pass prototypes and what they become in ohms and hertz.

Formulas: Matthaei, Young and Jones, Microwave Filters; Pozar, Microwave Engineering, chapter 8 (from memory;
values agree with the printed tables to their last digit but one).
"""

from __future__ import annotations

from typing import Any

import numpy as np

__all__ = ["butterworth", "chebyshev", "scaled"]


def butterworth(order: int) -> tuple[float, ...]:
    """``g1 .. gn, g(n+1)`` with the 3 dB edge at 1 rad/s.

    Examples
    --------
    >>> [round(g, 4) for g in butterworth(3)]
    [1.0, 2.0, 1.0, 1.0]
    """
    g = [2.0 * float(np.sin((2 * k - 1) * np.pi / (2 * order))) for k in range(1, order + 1)]
    return (*g, 1.0)


def chebyshev(order: int, ripple_db: float) -> tuple[float, ...]:
    """``g1 .. gn, g(n+1)`` with the ripple's edge at 1 rad/s; an even order wants another load.

    Examples
    --------
    >>> [round(g, 4) for g in chebyshev(2, 0.5)]
    [1.4029, 0.7071, 1.9841]
    """
    beta = float(np.log(1.0 / np.tanh(ripple_db * np.log(10.0) / 40.0)))
    gamma = float(np.sinh(beta / (2 * order)))
    a = [float(np.sin((2 * k - 1) * np.pi / (2 * order))) for k in range(1, order + 1)]
    b = [gamma**2 + float(np.sin(k * np.pi / order)) ** 2 for k in range(1, order + 1)]
    g = [2.0 * a[0] / gamma]
    for k in range(1, order):
        g.append(4.0 * a[k - 1] * a[k] / (b[k - 1] * g[k - 1]))
    return (*g, 1.0 if order % 2 else float(1.0 / np.tanh(beta / 4.0) ** 2))


def scaled(
    g: tuple[float, ...],
    passes: str,
    edge_hz: float,
    width_hz: float = 0.0,
    first: str = "shunt",
    z0: float = 50.0,
) -> list[dict[str, Any]]:
    """Elements of a ladder.

    Parameters
    ----------
    g
        Prototype with its load as last value.
    passes
        ``"low"``, ``"high"``, ``"band"`` or ``"all but a band"``.
    edge_hz
        Edge; of a band the geometric centre.
    width_hz
        Of a band.
    first
        Where ``g1`` stands: ``"shunt"`` or ``"series"``.
    z0
        Reference in ohm.

    Returns
    -------
    list of dict
        ``{name, place, coil | capacitor}`` in SI units, as :func:`sim_instruments.parts.ladder.ladder`
        takes them; names count the branches: ``L1``, ``C1``, ... Of a band-stop, the two of a branch are
        joined: side by side in a series branch, in line in a shunt one.

    Raises
    ------
    ValueError
        For another kind of band, or a place that is none.
    """
    if first not in ("shunt", "series"):
        raise ValueError(f"the first element stands in shunt or series, not {first!r}")
    w, places = 2 * np.pi * edge_hz, ("shunt", "series") if first == "shunt" else ("series", "shunt")
    elements: list[dict[str, Any]] = []
    for k, value in enumerate(g[:-1], 1):
        place = places[(k - 1) % 2]
        coil, capacitor = value * z0 / w, value / (z0 * w)
        if passes == "low":
            pair = {"coil": coil} if place == "series" else {"capacitor": capacitor}
        elif passes == "high":
            pair = {"capacitor": 1 / (z0 * w * value)} if place == "series" else {"coil": z0 / (w * value)}
        elif passes == "band":
            share = width_hz / edge_hz
            if place == "series":
                pair = {"coil": coil / share, "capacitor": share / (w * value * z0)}
            else:
                pair = {"coil": share * z0 / (w * value), "capacitor": capacitor / share}
        elif passes == "all but a band":
            share = width_hz / edge_hz
            if place == "series":
                pair = {"coil": coil * share, "capacitor": 1 / (share * w * value * z0)}
            else:
                pair = {"coil": z0 / (w * value * share), "capacitor": capacitor * share}
        else:
            raise ValueError(f"a filter passes low, high, band or all but a band, not {passes!r}")
        elements += [
            {"name": f"{'L' if what == 'coil' else 'C'}{k}", "place": place, what: float(size)}
            for what, size in pair.items()
        ]
        if passes == "all but a band":
            elements[-1]["joined"] = "across" if place == "series" else "in line"
    return elements
