"""Filters and matching networks by what they are for; each becomes a ladder of real elements."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.parts.base import Part, known_keys
from sim_instruments.parts.ladder import ladder
from sim_instruments.parts.prototypes import butterworth, chebyshev, scaled
from sim_instruments.values import number

__all__ = ["coupled_resonators", "filter_", "matching", "matching_elements"]

_QUALITY = ("coil q", "capacitor q", "q at", "tolerance", "drift", "exact")


def _real(elements: list[dict[str, Any]], spec: Mapping[str, Any]) -> dict[str, Any]:
    """The elements as they can be bought: with Q, tolerance and drift."""
    for element in elements:
        q = spec.get("coil q" if "coil" in element else "capacitor q")
        element |= {"q": q} if q is not None else {}
        element |= {key: spec[key] for key in ("q at", "tolerance", "drift") if key in spec}
    return {"elements": elements, "faults": spec.get("faults", ()), "exact": bool(spec.get("exact"))}


def _prototype(spec: Mapping[str, Any]) -> tuple[float, ...]:
    order, shape = int(spec["order"]), spec["shape"]
    if not 1 <= order <= 25:
        raise ValueError(f"order {order} is none from 1 to 25")
    if shape == "butterworth":
        return butterworth(order)
    if shape == "chebyshev":
        return chebyshev(order, number(spec["ripple"]))
    raise ValueError(f"a filter's shape is butterworth or chebyshev, not {shape!r}")


def filter_(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A filter from its prototype.

    Parameters
    ----------
    spec
        ``shape``, ``order``, ``ripple`` (dB); ``passes``: low, high, band or all but a band; ``edge``,
        or ``center`` and ``width``; ``first``: shunt or series; ``impedance``; ``coil q``, ``capacitor q`` at
        ``q at``; ``tolerance``, ``drift`` (ppm/K), ``exact``; ``faults`` as of a ladder.
    draws
        For tolerances.
    """
    known_keys(
        spec, "shape", "order", "ripple", "passes", "edge", "center", "width", "first", "impedance", *_QUALITY
    )
    passes = str(spec.get("passes", "low"))
    is_band = passes.endswith("band")
    edge = number(spec["center" if is_band else "edge"])
    width = number(spec["width"]) if is_band else 0.0
    elements = scaled(
        _prototype(spec),
        passes,
        edge,
        width,
        str(spec.get("first", "shunt")),
        number(spec.get("impedance", 50.0)),
    )
    return ladder(_real(elements, spec), draws)


def coupled_resonators(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A band-pass of parallel resonators coupled by small capacitors, for 50 ohm.

    Admittance inverters between shunt resonators, each a series capacitor whose negative shunt arms go
    into the resonators; the end ones with the usual correction (Matthaei, Young and Jones, 8.05, from
    memory). Narrow-band: good to some percent of relative width.

    Parameters
    ----------
    spec
        ``shape``, ``order``, ``ripple``, ``center``, ``width``; ``coil``: inductance of each resonator;
        Q, tolerance and ``faults`` as of a filter. Elements are ``C01 L1 C1 C12 L2 C2 ...``.
    draws
        For tolerances.

    Raises
    ------
    ValueError
        If couplings come out larger than the resonators bear.
    """
    known_keys(spec, "shape", "order", "ripple", "center", "width", "coil", *_QUALITY)
    g = (1.0, *_prototype(spec))
    center, share = number(spec["center"]), number(spec["width"]) / number(spec["center"])
    w, coil, n = 2 * np.pi * center, number(spec["coil"]), len(g) - 2
    total = 1 / (w * w * coil)
    slope = w * total
    j = [float(np.sqrt(share * slope / (50.0 * g[0] * g[1])))]
    j += [share * slope / float(np.sqrt(g[k] * g[k + 1])) for k in range(1, n)]
    j += [float(np.sqrt(share * slope / (50.0 * g[n] * g[n + 1])))]
    if max(j[0], j[-1]) >= 1 / 50.0:
        raise ValueError("the coil is too small: the end couplings cannot be made by capacitors")
    couple = [x / w for x in j]
    taken = list(couple)  # what each coupling takes from a resonator
    for end in (0, n):
        couple[end] = j[end] / (w * float(np.sqrt(1 - (50.0 * j[end]) ** 2)))
        taken[end] = couple[end] / (1 + (w * couple[end] * 50.0) ** 2)
    elements: list[dict[str, Any]] = [{"name": "C01", "place": "series", "capacitor": couple[0]}]
    for k in range(1, n + 1):
        own = total - taken[k - 1] - taken[k]
        if own <= 0:
            raise ValueError(f"resonator {k} has no capacitance left: a smaller coil is needed")
        elements += [
            {"name": f"L{k}", "place": "shunt", "coil": coil},
            {"name": f"C{k}", "place": "shunt", "capacitor": own},
            {"name": f"C{k}{k + 1}", "place": "series", "capacitor": couple[k]},
        ]
    return ladder(_real(elements, spec), draws)


def matching_elements(shape: str, at_hz: float, load: complex, q: float = 3.0) -> list[dict[str, Any]]:
    """Elements that make 50 ohm at port 1 of a load at port 2, at one frequency.

    Parameters
    ----------
    shape
        ``"L"`` (its Q follows from the load), ``"pi"`` or ``"tee"`` with a loaded ``q``.
    at_hz
        Where.
    load
        In ohm; its real part must be above 0.

    Raises
    ------
    ValueError
        For another shape, a load without resistance, or a Q too low for the step.

    Notes
    -----
    The load's own reactance is taken up by the arm beside it. L section: ``Q = sqrt(R_high/R_low - 1)``;
    pi and tee are two of them back to back over a virtual resistance (Bowick, RF Circuit Design, ch. 4,
    from memory).
    """
    r, x = load.real, load.imag
    if r <= 0:
        raise ValueError(f"a load of {load} ohm cannot be matched")
    if shape == "L":
        if r < 50:  # shunt at port 1, series beside the load
            q_l = float(np.sqrt(50 / r - 1))
            arms = [("shunt", -50 / q_l if q_l else np.inf), ("series", q_l * r - x)]
        else:  # series at port 1, shunt beside the load
            b_load = -x / (r * r + x * x)
            r_parallel = (r * r + x * x) / r
            q_l = float(np.sqrt(r_parallel / 50 - 1))
            b = q_l / r_parallel - b_load
            arms = [("series", q_l * 50), ("shunt", -1 / b if b else np.inf)]
    elif shape == "pi":
        r_parallel, b_load = (r * r + x * x) / r, -x / (r * r + x * x)
        middle = max(50, r_parallel) / (q * q + 1)
        if middle > min(50, r_parallel):
            raise ValueError(f"a loaded Q of {q:g} is too low to bring {load} ohm to 50 ohm")
        q1, q2 = float(np.sqrt(50 / middle - 1)), float(np.sqrt(r_parallel / middle - 1))
        b = q2 / r_parallel - b_load
        arms = [
            ("shunt", -50 / q1 if q1 else np.inf),
            ("series", (q1 + q2) * middle),
            ("shunt", -1 / b if b else np.inf),
        ]
    elif shape == "tee":
        middle = min(50, r) * (q * q + 1)
        if middle < max(50, r):
            raise ValueError(f"a loaded Q of {q:g} is too low to bring {load} ohm to 50 ohm")
        q1, q2 = float(np.sqrt(middle / 50 - 1)), float(np.sqrt(middle / r - 1))
        arms = [("series", q1 * 50), ("shunt", -middle / (q1 + q2)), ("series", q2 * r - x)]
    else:
        raise ValueError(f"a matching network is L, pi or tee, not {shape!r}")
    return _arms(arms, 2 * np.pi * at_hz)


def _arms(arms: list[tuple[str, float]], w: float) -> list[dict[str, Any]]:
    elements: list[dict[str, Any]] = []
    for place, x in arms:
        if x == 0 or np.isinf(x):
            continue
        n = len(elements) + 1
        elements.append(
            {"name": f"L{n}", "place": place, "coil": float(x / w)}
            if x > 0
            else {"name": f"C{n}", "place": place, "capacitor": float(-1 / (w * x))}
        )
    return elements


def matching(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A matching network from 50 ohm at port 1 to a load at port 2.

    Parameters
    ----------
    spec
        ``shape``: L, pi or tee; ``at``; ``load``: ``[R, X]`` in ohm; ``q`` of pi and tee; Q, tolerance and
        ``faults`` as of a filter.
    draws
        For tolerances.
    """
    known_keys(spec, "shape", "at", "load", "q", *_QUALITY)
    r, x = (number(v) for v in spec["load"])
    elements = matching_elements(
        str(spec["shape"]), number(spec["at"]), complex(r, x), number(spec.get("q", 3.0))
    )
    return ladder(_real(elements, spec), draws)
