"""Analyzers that differ: limits, IF bandwidth steps, what happens beyond them."""

from __future__ import annotations

import pytest

from sim_instruments.bench import load_bench
from sim_instruments.instruments.manners import Limits, Manners
from sim_instruments.scpi.errors import ScpiError


@pytest.mark.parametrize(
    ("wanted", "given"),
    [
        (1.0, 1.0),
        (1.7, 1.0),
        (1.8, 3.0),
        (5.4, 3.0),
        (5.5, 10.0),
        (1e3, 1e3),
        (2e3, 3e3),
        (99e3, 1e5),
        (1e6, 1e6),
    ],
)
def test_the_nearest_step_in_ratio_is_taken(wanted, given):
    assert Manners(steps=(1.0, 3.0)).bandwidth(wanted) == pytest.approx(given, rel=1e-12)


def test_a_bandwidth_between_steps_can_be_refused():
    manners = Manners(steps=(1.0, 2.0, 5.0), between_steps="refuse")
    assert manners.bandwidth(2e4) == pytest.approx(2e4)
    with pytest.raises(ScpiError, match="next is 2000") as caught:
        manners.bandwidth(2.5e3)
    assert caught.value.number == -222


def test_beyond_a_limit_both_complain_and_one_moves(make_bench):
    limits = {"power": ["-45 dBm", "10 dBm"]}
    moving = make_bench(limits, {"beyond limits": "nearest"})
    staying = make_bench(limits)
    assert moving.after("SOUR:POW 12 DBM") == staying.after("SOUR:POW 12 DBM") == [-222]
    assert (moving.ask("SOUR:POW?"), staying.ask("SOUR:POW?")) == ("10", "-10")
    assert moving.after("SOUR:POW 1 V") == [-131]


@pytest.mark.parametrize(
    ("limits", "says"),
    [
        ({"frequency": ["6 GHz", "1 GHz"]}, "no range"),
        ({"points": 1}, "two at least"),
        ({"pionts": 5}, "no 'pionts'; known are frequency, points"),
        ({"power": ["ten dBm", "20 dBm"]}, "ten dBm"),
    ],
)
def test_limits_that_make_no_sense_say_why(limits, says):
    with pytest.raises(ValueError, match=says):
        Limits.read(limits)


@pytest.mark.parametrize(
    ("manners", "says"),
    [
        ({"steps": [0.5]}, "from 1 up to less than 10"),
        ({"between steps": "maybe"}, "allowed are nearest, refuse"),
        ({"beyond": "refuse"}, "no 'beyond'"),
    ],
)
def test_manners_that_make_no_sense_say_why(manners, says):
    with pytest.raises(ValueError, match=says):
        Manners.read(manners)


def test_the_two_analyzers_of_the_workshop_differ():
    first, second = load_bench("workshop", 1).instruments.values()
    answers = []
    for analyzer in (first, second):
        line = analyzer.line()
        line.receive(b"FREQ:STOP? MAX;:SWE:POIN? MAX;:SOUR:POW? MIN;:BAND 2 KHZ;:BAND?\n")
        line.proceed()
        answers.append(line.take(1000)[0])
    assert answers == [b"8500000000;100001;-55;3000\n", b"6000000000;20001;-45;2000\n"]
