"""Recorded readings behind the analyzer's front."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from sim_instruments.draws import Draws
from sim_instruments.instruments.recorded import Recorded
from sim_instruments.parts import build
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.world import World

F = np.array([1e8, 2e8, 3e8])
ONE = "# MHz S RI R 50\n100 .1 .2\n200 .3 .4\n300 .5 .6\n"
TWO = "# MHz S RI R 50\n" + "".join(f"{f} .1 0 .2 0 .3 0 .4 0\n" for f in (100, 200, 300))


@pytest.fixture
def recorded(tmp_path: Path) -> Recorded:
    (tmp_path / "short.s1p").write_text(ONE, encoding="ascii")
    (tmp_path / "pad.s2p").write_text(TWO, encoding="ascii")
    draws = Draws(1)
    items = {
        "short": build({"kind": "standard", "standard": "short"}, draws),
        "open": build({"kind": "standard", "standard": "open"}, draws),
        "pad": build({"kind": "pad", "loss": "10 dB"}, draws),
    }
    files = {
        "short on port 1": tmp_path / "short.s1p",
        "short on port 2": tmp_path / "short.s1p",
        "pad from port 1 to port 2": tmp_path / "pad.s2p",
    }
    return Recorded(World(1, items), files)


def test_a_two_port_reading_comes_back_as_recorded(recorded: Recorded) -> None:
    """Rows are receiving ports: S21 is in row 2, column 1."""
    recorded.world.connect([(["pad"], [1, 2])])
    m = recorded.read(F, 1e3, -10.0, 1, True)
    np.testing.assert_array_equal(m[1], [[0.1, 0.3], [0.2, 0.4]])


@pytest.mark.parametrize("port", [1, 2])
def test_a_one_port_reading_stands_at_its_port(recorded: Recorded, port: int) -> None:
    """Everything else reads nothing."""
    recorded.world.connect([(["short"], [port])])
    m = recorded.read(F, 1e3, -10.0, 1, True)
    np.testing.assert_array_equal(m[:, port - 1, port - 1], [0.1 + 0.2j, 0.3 + 0.4j, 0.5 + 0.6j])
    m[:, port - 1, port - 1] = 0
    assert not m.any()


def test_another_grid_is_a_settings_conflict(recorded: Recorded) -> None:
    """-221, with what was recorded."""
    recorded.world.connect([(["pad"], [1, 2])])
    with pytest.raises(ScpiError, match="3 points from 1e\\+08 to 3e\\+08 Hz") as caught:
        recorded.read(F[:2], 1e3, -10.0, 1, True)
    assert caught.value.number == -221
    with pytest.raises(ScpiError):
        recorded.read(F * (1 + 1e-6), 1e3, -10.0, 1, True)


def test_nothing_recorded_is_stale_data(recorded: Recorded) -> None:
    """-230, with what is connected."""
    recorded.world.connect([(["open"], [1])])
    with pytest.raises(ScpiError, match="nothing was recorded for open on port 1") as caught:
        recorded.read(F, 1e3, -10.0, 1, True)
    assert caught.value.number == -230
