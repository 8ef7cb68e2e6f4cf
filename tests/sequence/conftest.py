"""Files as text, and where something in them stands."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from benchrun.errors import InputError, Problem
from benchrun.paths import installed_sequences
from benchrun.sequence.files import KINDS, Loaded, load_model

GOOD = """\
sequence: demo
edition: 1
title: Demo
unit:
  part: low-pass filter
  serial: "HF-[0-9]{4}"
  withstands: {power: 30 dBm}
sweeps:
  wide: {from: 5 MHz, to: 1.2 GHz, points: 801, bandwidth: 1 kHz, power: -10 dBm}
steps:
  - calibrate: {as: plane, sweep: wide, method: SOLT, kit: n50}
  - sweep: {as: raw, with: plane}
  - de-embed: {as: filter, from: raw, left: left.s2p}
  - judge:
      from: filter
      limits:
        - {figure: insertion loss, over: 160 MHz to 175 MHz, at most: 0.45 dB}
        - {trace: S21, mask: stop}
"""


@pytest.fixture
def good() -> str:
    """Text of a sequence without a fault."""
    return GOOD


@pytest.fixture
def installed() -> Path:
    """Folder of the installed sequences."""
    return installed_sequences()


@pytest.fixture
def load_text() -> Callable[..., Loaded[Any]]:
    """Read text as one kind of file."""

    def load(text: str | bytes, kind: str = "sequence") -> Loaded[Any]:
        raw = text.encode() if isinstance(text, str) else text
        return load_model(raw, "f.yaml", KINDS[kind])

    return load


@pytest.fixture
def problems(load_text: Callable[..., Loaded[Any]]) -> Callable[..., tuple[Problem, ...]]:
    """Read text that must be refused, and give its problems."""

    def refuse(text: str | bytes, kind: str = "sequence") -> tuple[Problem, ...]:
        with pytest.raises(InputError) as caught:
            load_text(text, kind)
        assert caught.value.exit_code == 2
        return caught.value.problems

    return refuse


@pytest.fixture
def changed(problems: Callable[..., tuple[Problem, ...]]) -> Callable[..., tuple[Problem, str]]:
    """Change the good file once; give the only problem, and the text that stands where it points."""

    def change(old: str, new: str, base: str = GOOD, kind: str = "sequence") -> tuple[Problem, str]:
        assert base.count(old) == 1, old
        text = base.replace(old, new)
        found = problems(text, kind)
        assert len(found) == 1, [str(p) for p in found]
        line = text.split("\n")[found[0].line - 1]
        return found[0], line[found[0].column - 1 :]

    return change
