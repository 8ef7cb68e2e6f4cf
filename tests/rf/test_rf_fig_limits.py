"""Every figure of the table can be written in a sequence, with its parameters, and is measured from that."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose
from pydantic import ValidationError

from benchrun.rf.figures import FIGURES
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.steps.judge import FigureLimit

F_HZ = 1e6 * np.arange(1, 401)
WRITTEN = {
    "over": "140 MHz to 160 MHz", "aperture": "5 MHz", "drop": "3 dB", "outer": "20 dB", "velocity": 0.66,
    "distance": "1.5 m", "within": "0.2 m to 40 m", "reference": "50 ohm", "port": 1, "edge": "lower",
}  # fmt: skip
EXAMPLE = {
    "": "1.5",
    "dB": "1 dB",
    "Hz": "150 MHz",
    "s": "10 ns",
    "ohm": "50 ohm",
    "deg": "10 deg",
    "m": "2 m",
}
NAMES = sorted(name for name, kind in FIGURES.items() if kind.domain == "sweep")


def network() -> TwoPort:
    """A tuned circuit at 150 MHz behind a metre of line with a small reflection at 4 m."""
    x = 15.0 * (F_HZ / 150e6 - 150e6 / F_HZ)
    s21 = 0.9 * np.exp(-2j * np.pi * F_HZ * 5e-9) / (1 + 1j * x)
    far = 0.2 * np.exp(-4j * np.pi * F_HZ * 4.0 / (0.66 * 299792458.0))
    return TwoPort(far, s21, s21, 0.8 * far)


def written(name: str) -> dict[str, object]:
    kind = FIGURES[name]
    keys = {key: WRITTEN[key] for key in kind.parameters if key in WRITTEN}
    return {"figure": name, **keys, "at most": EXAMPLE[kind.dimension.unit]}


@pytest.mark.parametrize("name", NAMES)
def test_a_limit_is_read_and_measured(name: str) -> None:
    """Whole numbers of every parameter go from text to the figure; people read each of them again."""
    limit = FigureLimit.model_validate(written(name))
    found = limit.kind.measure(F_HZ, network(), "at most", **limit.parameters)
    assert np.isfinite(found.value)
    assert np.isfinite(found.at_hz)
    assert name in limit.text


def test_the_words_of_a_limit_along_a_line() -> None:
    limit = FigureLimit.model_validate(written("distance to fault"))
    assert limit.text == "distance to fault, port 1, velocity 0.66, within 200 mm to 40 m"
    assert limit.parameters == {"velocity": 0.66, "within": (0.2, 40.0), "port": 1}
    found = limit.kind.measure(F_HZ, network(), "at most", **limit.parameters)
    assert_allclose(found.value, 4.0, atol=1e-3)


@pytest.mark.parametrize(
    ("name", "change", "said"),
    [
        ("distance to fault", {"velocity": None}, "distance to fault needs `velocity`"),
        ("distance to fault", {"velocity": 1.2}, "less than or equal to 1"),
        ("distance to fault", {"within": "4 m to 1 m"}, "does not increase"),
        ("impedance at distance", {"distance": "1.5"}, "has no unit"),
        ("impedance at distance", {"reference": "-50 ohm"}, "greater than 0"),
        ("shape factor", {"outer": None}, "shape factor needs `outer`"),
        ("gain", {"reference": "50 ohm"}, "`reference` means nothing for gain"),
    ],
)
def test_a_slip_is_told(name: str, change: dict[str, object], said: str) -> None:
    text = {k: v for k, v in {**written(name), **change}.items() if v is not None}
    with pytest.raises(ValidationError, match=said):
        FigureLimit.model_validate(text)
