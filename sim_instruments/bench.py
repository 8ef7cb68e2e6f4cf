"""A simulated bench from its YAML file: a world with everything on it, and the instruments' addresses."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Protocol

import yaml

from sim_instruments.draws import Draws
from sim_instruments.instruments.analyzer import Analyzer
from sim_instruments.instruments.kinds import KINDS
from sim_instruments.instruments.receivers import Receivers, WorldReadings
from sim_instruments.instruments.recorded import Recorded
from sim_instruments.instruments.routing import WiredWorld
from sim_instruments.instruments.settings import allowed
from sim_instruments.parts import Part, build
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.trouble import BadBench, at, table
from sim_instruments.units import Family, Units, placed
from sim_instruments.values import number
from sim_instruments.world import World

__all__ = ["BadBench", "Happening", "SimulatedBench", "load_bench"]

_FOLDER = Path(__file__).parent / "benches"
_LOADER: Any = getattr(yaml, "CSafeLoader", yaml.SafeLoader)
"""The same loader in C where the library has it: ten times as fast."""


class Happening(Protocol):
    """A fault on the way, by name."""

    name: str
    seen: int
    happened: int


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
    injected
        Faults put into it, with how often each has had occasion and has happened.
    """

    world: World
    instruments: Mapping[str, Instrument]
    serials: Mapping[str, str]
    fixtures: Mapping[str, Part]
    injected: tuple[Happening, ...] = ()


def load_bench(name: str, seed: int, folder: Path = _FOLDER) -> SimulatedBench:
    """A bench by name, or by the path of its file.

    Parameters
    ----------
    name
        ``"workshop"``, or a path that ends in ``.yaml``.
    seed
        Of the world.
    folder
        Where names are looked up.

    Raises
    ------
    BadBench
        If there is no such file, or it makes no sense; the sentence says where.
    """
    path = Path(name) if name.endswith(".yaml") else folder / f"{name}.yaml"
    try:
        spec = yaml.load(path.read_text(encoding="utf-8"), Loader=_LOADER)
    except OSError as error:
        known = ", ".join(sorted(p.stem for p in folder.glob("*.yaml")))
        raise BadBench(
            f"there is no simulated bench {name!r} ({error.strerror}); known are {known}"
        ) from error
    except (yaml.YAMLError, UnicodeDecodeError) as error:
        raise BadBench(f"simulated bench {path}: {' '.join(str(error).split())}") from error
    try:
        return _build(spec, seed, path.parent)
    except BadBench as error:
        raise BadBench(f"simulated bench {path}: {error}") from (error.__cause__ or error)


def _build(spec: Any, seed: int, folder: Path) -> SimulatedBench:
    spec = table(spec, "the file")
    if "instruments" not in spec:
        raise BadBench("'instruments' is missing")
    draws = Draws(seed)
    items: dict[str, Part] = {}
    fixtures: dict[str, Part] = {}
    for name, s in table(spec.get("items") or {}, "items").items():
        with at(f"item {name!r}"):
            items[name] = build(placed(s, folder), draws / "item" / name)
            if items[name].kind == "fixture":
                fixtures[name] = build({**s, "spread": {}}, draws)
    families = [
        Family(str(name), table(family, f"unit family {name!r}"), folder, draws / "unit")
        for name, family in table(spec.get("units") or {}, "units").items()
    ]
    units = Units(families)
    with at("room"):
        world = WiredWorld(
            seed, items, units, number(spec.get("temperature", 23.0)),
            drift_k_h=number(spec.get("drift", 0.0)), torque_wrench=bool(spec.get("torque wrench", True)),
            humidity=number(spec.get("humidity", 0.45)),
        )  # fmt: skip
    instruments: dict[str, Instrument] = {}
    for resource, s in table(spec["instruments"], "instruments").items():
        with at(f"instrument {resource!r}"):
            instruments[resource] = _instrument(world, resource, s, draws, folder)
    return SimulatedBench(world, instruments, units.known, fixtures)


def _instrument(
    world: WiredWorld, resource: str, spec: Mapping[str, Any], draws: Draws, folder: Path
) -> Instrument:
    kind = spec["kind"]
    model, serial = str(spec.get("model", "NA-2")), str(spec.get("serial", "0001"))
    if kind == "network analyzer":
        allowed("a network analyzer", spec, "kind", "model", "serial", "limits", "manners", "receivers")
        receivers = Receivers(spec["receivers"], draws / "instrument" / resource)
        return Analyzer(
            world, WorldReadings(world, receivers), ("SIMULATED", model, serial, "1.0"),
            spec.get("limits"), spec.get("manners"),
        )  # fmt: skip
    if kind == "recorded readings":
        allowed("an analyzer of recorded readings", spec, "kind", "model", "serial", "readings")
        files = {str(what): folder / str(file) for what, file in spec["readings"].items()}
        return Analyzer(world, Recorded(world, files), ("RECORDED", model, serial, "1.0"))
    if kind in KINDS:
        return KINDS[kind](world, ("SIMULATED", model, serial, "1.0"), spec, draws / "instrument" / resource)
    raise BadBench(f"instrument {resource!r}: there is no instrument of kind {kind!r}")
