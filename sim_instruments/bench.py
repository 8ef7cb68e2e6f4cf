"""A simulated bench from its YAML file: a world with everything on it, and the instruments' addresses."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import yaml

from sim_instruments.draws import Draws
from sim_instruments.instruments.analyzer import Analyzer, Simulated
from sim_instruments.instruments.receivers import Receivers
from sim_instruments.instruments.recorded import Recorded
from sim_instruments.parts import Part, build
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.values import number
from sim_instruments.world import NoSuchItem, World

__all__ = ["BadBench", "SimulatedBench", "load_bench"]

_FOLDER = Path(__file__).parent / "benches"


class BadBench(ValueError):
    """A simulated bench's file makes no sense."""


@dataclass(frozen=True)
class SimulatedBench:
    """A world and its instruments.

    Parameters
    ----------
    world
        The world.
    instruments
        By VISA resource name.
    serials
        Units that the bench is known for, each with what is to be said of it.
    fixtures
        Nominal jig halves: what their data sheet says, without this specimen's departures.
    """

    world: World
    instruments: Mapping[str, Instrument]
    serials: Mapping[str, str]
    fixtures: Mapping[str, Part]


def load_bench(name: str, seed: int, folder: Path = _FOLDER) -> SimulatedBench:
    """A bench by name, or by the path of its file.

    Parameters
    ----------
    name
        ``"workshop"``, or a path that ends in ``.yaml``.
    seed
        Of the world.

    Raises
    ------
    BadBench
        If there is no such file, or it makes no sense.
    """
    path = Path(name) if name.endswith(".yaml") else folder / f"{name}.yaml"
    try:
        spec = yaml.safe_load(path.read_text(encoding="utf-8"))
        return _build(spec, seed, path.parent)
    except OSError as error:
        known = ", ".join(sorted(p.stem for p in folder.glob("*.yaml")))
        raise BadBench(
            f"there is no simulated bench {name!r} ({error.strerror}); known are {known}"
        ) from error
    except (KeyError, TypeError, ValueError, AttributeError, yaml.YAMLError) as error:
        raise BadBench(f"simulated bench {path}: {type(error).__name__} {error}") from error


def _build(spec: Mapping[str, Any], seed: int, folder: Path) -> SimulatedBench:
    draws = Draws(seed)
    items = {
        name: build(_placed(s, folder), draws / "item" / name) for name, s in spec.get("items", {}).items()
    }
    fixtures = {
        name: build({**s, "spread": {}}, draws)
        for name, s in spec.get("items", {}).items()
        if s.get("kind") == "fixture"
    }
    families = spec.get("units", {})
    known: dict[str, str] = {}
    for family in families.values():
        known.update(
            {serial: str((v or {}).get("says", "good")) for serial, v in family.get("known", {}).items()}
        )

    def unit(serial: str) -> Part:
        for family in families.values():
            if re.fullmatch(str(family["serial"]), serial):
                change = {k: v for k, v in (family.get("known", {}).get(serial) or {}).items() if k != "says"}
                return build(_placed({**family["design"], **change}, folder), draws / "unit" / serial)
        raise NoSuchItem(f"the simulated bench has no unit {serial!r}; it has {', '.join(known) or 'none'}")

    world = World(seed, items, unit, number(spec.get("temperature", 23.0)))
    instruments = {r: _instrument(world, r, s, draws, folder) for r, s in spec["instruments"].items()}
    return SimulatedBench(world, instruments, known, fixtures)


def _placed(spec: Mapping[str, Any], folder: Path) -> dict[str, Any]:
    """File names in a description are looked up beside the bench file."""
    return {**spec, "file": str(folder / spec["file"])} if "file" in spec else dict(spec)


def _instrument(
    world: World, resource: str, spec: Mapping[str, Any], draws: Draws, folder: Path
) -> Instrument:
    kind = spec["kind"]
    model, serial = str(spec.get("model", "NA-2")), str(spec.get("serial", "0001"))
    if kind == "network analyzer":
        receivers = Receivers(spec["receivers"], draws / "instrument" / resource)
        return Analyzer(world, Simulated(world, receivers), ("SIMULATED", model, serial, "1.0"))
    if kind == "recorded readings":
        files = {str(what): folder / str(file) for what, file in spec["readings"].items()}
        return Analyzer(world, Recorded(world, files), ("RECORDED", model, serial, "1.0"))
    raise BadBench(f"there is no instrument of kind {kind!r}")
