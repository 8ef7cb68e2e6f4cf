"""From file names to a plan: everything resolved, read, checked and hashed before anything moves."""

from __future__ import annotations

import datetime
import hashlib
import json
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path, PurePath
from typing import TypeVar

from pydantic import BaseModel

from benchrun.errors import InputError, Problem
from benchrun.evaluate.building import build
from benchrun.evaluate.chain import hookups
from benchrun.evaluate.procedure import Procedure
from benchrun.hookup import Hookup
from benchrun.instruments.dialect import Dialect, load_dialect
from benchrun.instruments.scalar_dialects import (
    load_generator_dialect,
    load_spectrum_dialect,
    load_supply_dialect,
)
from benchrun.record.payload import safe_name
from benchrun.rf.touchstone import TouchstoneData
from benchrun.rf.touchstone import read as read_touchstone
from benchrun.sequence.bench import Bench
from benchrun.sequence.checks import check_bench, check_masks, check_sequence
from benchrun.sequence.fields import FileModel
from benchrun.sequence.files import Loaded, read
from benchrun.sequence.find import find, named
from benchrun.sequence.fixtures import check_fixtures
from benchrun.sequence.kit import KitFile
from benchrun.sequence.kits import check_connectors, check_kits, check_standards
from benchrun.sequence.loading import read_bytes
from benchrun.sequence.mask import MaskFile
from benchrun.sequence.models import Sequence
from benchrun.sequence.resolve import step_paths
from benchrun.sequence.steps import Calibrate, DeEmbed, Judge
from benchrun.sequence.steps.judge import MaskLimit

__all__ = ["FIXTURE_BYTES", "Named", "Plan", "bench_for", "check_file", "make_plan", "resolve"]

FIXTURE_BYTES = 20_000_000
M = TypeVar("M", bound=BaseModel)


@dataclass(frozen=True, slots=True)
class Named:
    """What the names in a sequence resolved to, as far as they did.

    Parameters
    ----------
    kits, masks
        Files by the name that the sequence uses.
    fixtures
        Touchstone data with its bytes, by name.
    standards
        Measured standards with their bytes, by kit and name in the kit file.
    problems
        What did not resolve or makes no sense.
    """

    kits: Mapping[str, Loaded[KitFile]]
    masks: Mapping[str, Loaded[MaskFile]]
    fixtures: Mapping[str, tuple[bytes, TouchstoneData]]
    standards: Mapping[tuple[str, str], tuple[bytes, TouchstoneData]]
    problems: tuple[Problem, ...]


@dataclass(frozen=True, slots=True)
class Plan:
    """A run that may begin.

    Parameters
    ----------
    sequence, bench
        The two files.
    dialect
        How the network analyzer wants to be spoken to; None where no step needs one.
    others
        Dialects of other instruments that the steps need, by role.
    procedure
        The arithmetic.
    inputs
        Every file used: logical name to path inside a record and bytes.
    digest
        SHA-256 over names and bytes of all inputs: two runs with the same digest were told the same.
    """

    sequence: Loaded[Sequence]
    bench: Loaded[Bench]
    dialect: Dialect | None
    others: Mapping[str, FileModel]
    procedure: Procedure
    inputs: Mapping[str, tuple[str, bytes]]
    digest: str

    @property
    def hookups(self) -> tuple[Hookup, ...]:
        """All connections that hands must make, in order; the same one twice in a row counts once."""
        found: list[Hookup] = []
        for step in self.sequence.model.steps:
            for hookup in hookups(step, self.procedure):
                if not found or found[-1] != hookup:
                    found.append(hookup)
        return tuple(found)


def resolve(loaded: Loaded[Sequence], today: datetime.date) -> Named:
    """Find and read what a sequence names, and check them together.

    Parameters
    ----------
    loaded
        The sequence.
    today
        For dates on which kits are due.
    """
    problems: list[Problem] = check_sequence(loaded)
    kits: dict[str, Loaded[KitFile]] = {}
    masks: dict[str, Loaded[MaskFile]] = {}
    fixtures: dict[str, tuple[bytes, TouchstoneData]] = {}

    def seek(kind: str, name: str, path: tuple[object, ...]) -> Path | None:
        line, column = loaded.document.place(path)
        try:
            return find(kind, name, loaded.folder, Problem("", loaded.document.name, line, column))
        except InputError as error:
            problems.extend(error.problems)
            return None

    def load(
        kind: str, name: str, path: tuple[object, ...], model: type[M], into: dict[str, Loaded[M]]
    ) -> None:
        if name in into or (file := seek(kind, name, path)) is None:
            return
        try:
            into[name] = read(file, model)
        except InputError as error:
            problems.extend(error.problems)

    for step, path in step_paths(loaded):
        if isinstance(step, Calibrate):
            load("kit", step.kit, (*path, "kit"), KitFile, kits)
        elif isinstance(step, Judge):
            for i, limit in enumerate(step.limits):
                if isinstance(limit, MaskLimit):
                    load("mask", limit.mask, (*path, "limits", i, "mask"), MaskFile, masks)
        elif isinstance(step, DeEmbed):
            for key, name in step.files().items():
                if name not in fixtures and (file := seek("fixture", name, (*path, *key))):
                    try:
                        raw = read_bytes(file, FIXTURE_BYTES)
                        fixtures[name] = raw, read_touchstone(raw, str(file))
                    except InputError as error:
                        problems.extend(error.problems)
    standards: dict[tuple[str, str], tuple[bytes, TouchstoneData]] = {}
    for name, kit in kits.items():
        measured, wrong = measured_standards(kit)
        standards |= {(name, file): found for file, found in measured.items()}
        problems += wrong
    files = {kit: {f: data for (k, f), (_, data) in standards.items() if k == kit} for kit in kits}
    problems += check_kits(loaded, kits, today, files)
    problems += check_masks(loaded, {name: mask.model.build() for name, mask in masks.items()})
    z0 = next((kit.model.impedance for kit in kits.values()), 50.0)
    problems += check_fixtures(loaded, {name: data for name, (_, data) in fixtures.items()}, z0)
    return Named(kits, masks, fixtures, standards, tuple(problems))


def measured_standards(
    kit: Loaded[KitFile],
) -> tuple[dict[str, tuple[bytes, TouchstoneData]], list[Problem]]:
    """Read the Touchstone files that a kit names; with what is wrong with them."""
    found: dict[str, tuple[bytes, TouchstoneData]] = {}
    problems: list[Problem] = []
    for place, name in kit.model.files().items():
        line, column = kit.document.place(place)
        try:
            file = find("standard", name, kit.folder, Problem("", kit.document.name, line, column))
            raw = read_bytes(file, FIXTURE_BYTES)
            found[name] = raw, read_touchstone(raw, str(file))
        except InputError as error:
            problems.extend(error.problems)
    return found, problems + check_standards(kit, {name: data for name, (_, data) in found.items()})


def make_plan(sequence: str, bench: str, today: datetime.date) -> Plan:
    """Resolve and check everything.

    Parameters
    ----------
    sequence, bench
        Names or paths.
    today
        For dates on which kits are due.

    Raises
    ------
    InputError
        With every problem found, in all files.
    """
    loaded = read(find("sequence", sequence), Sequence)
    named = resolve(loaded, today)
    problems = list(named.problems)
    bench_file, dialects = None, dict[str, FileModel]()
    try:
        bench_file = read(find("bench", bench), Bench)
        dialects = load_dialects(bench_file, loaded.model.roles)
        problems += check_bench(loaded, bench_file.model)
        problems += check_connectors(loaded, named.kits, bench_file.model)
    except InputError as error:
        problems += error.problems
    if problems or bench_file is None:
        raise InputError(problems)
    dialect = dialects.pop("analyzer", None)
    assert dialect is None or isinstance(dialect, Dialect)  # by its role
    inputs = _inputs(loaded, bench_file, named)
    procedure = build({name: raw for name, (_, raw) in inputs.items()})
    return Plan(loaded, bench_file, dialect, dialects, procedure, inputs, _digest(inputs))


def bench_for(sequence: str) -> str:
    """The first bench known by name that has every instrument which a sequence needs.

    Parameters
    ----------
    sequence
        Name or path.

    Raises
    ------
    InputError
        If the sequence cannot be read, or no bench has them all.
    """
    loaded = read(find("sequence", sequence), Sequence)
    wanted = set(loaded.model.roles)
    names = sorted(named("bench", loaded.folder), key=lambda item: (item[0] != "workshop", item[0]))
    for _, path in names:
        try:
            if wanted <= set(read(path, Bench).model.instruments):
                return str(path)
        except InputError:
            continue  # somebody's unfinished bench file is no hindrance here
    raise InputError(
        loaded.document.problem(
            f"needs {', '.join(sorted(wanted))}, and no bench known by name has them all",
            ("sequence",),
            "Name one with --bench.",
        )
    )


def load_dialects(bench: Loaded[Bench], roles: Iterable[str]) -> dict[str, FileModel]:
    """The dialects of a bench's instruments, for those roles that it has.

    Raises
    ------
    InputError
        At the place in the bench file that names one which is not there, or for a wrong dialect file.
    """
    loaders: Mapping[str, Callable[[str, Problem], FileModel]] = {
        "analyzer": lambda name, place: load_dialect(name, place=place),
        "generator": load_generator_dialect,
        "spectrum analyzer": load_spectrum_dialect,
        "supply": load_supply_dialect,
    }
    found: dict[str, FileModel] = {}
    for role, instrument in bench.model.instruments.items():
        if role in roles:
            place = bench.document.problem("", ("instruments", role, "dialect"))
            found[role] = loaders[role](instrument.dialect, place)
    return found


def _inputs(sequence: Loaded[Sequence], bench: Loaded[Bench], named: Named) -> dict[str, tuple[str, bytes]]:
    found = {
        "sequence": ("inputs/sequence.yaml", sequence.document.raw),
        "bench": ("inputs/bench.yaml", bench.document.raw),
    }
    for name, kit in named.kits.items():
        found[f"kit:{name}"] = _free(found, "inputs/kit", name, ".yaml"), kit.document.raw
    for (kit_name, file), (raw, _) in named.standards.items():
        free = _free(found, "inputs/standard", file, PurePath(file).suffix)
        found[f"standard:{kit_name}/{file}"] = free, raw
    for name, mask in named.masks.items():
        found[f"mask:{name}"] = _free(found, "inputs/mask", name, ".yaml"), mask.document.raw
    for name, (raw, _) in named.fixtures.items():
        found[f"fixture:{name}"] = _free(found, "inputs/fixture", name, PurePath(name).suffix), raw
    return found


def _free(found: Mapping[str, tuple[str, bytes]], start: str, name: str, suffix: str) -> str:
    """A path of its own for a name that may itself be a path."""
    stem, taken = safe_name(PurePath(name).stem), {path.casefold() for path, _ in found.values()}
    path, number = f"{start}-{stem}{suffix}", 1
    while path.casefold() in taken:
        number += 1
        path = f"{start}-{stem}-{number}{suffix}"
    return path


def _digest(inputs: Mapping[str, tuple[str, bytes]]) -> str:
    digests = {name: hashlib.sha256(raw).hexdigest() for name, (_, raw) in inputs.items()}
    return hashlib.sha256(json.dumps(digests, sort_keys=True).encode()).hexdigest()


def check_file(path: Path, today: datetime.date) -> list[Problem]:
    """Every problem of one file of any kind, its references included.

    Parameters
    ----------
    path
        A sequence, bench, kit or mask.
    today
        For dates on which kits are due.
    """
    from benchrun.sequence.files import KINDS, kind_of, validate
    from benchrun.sequence.loading import load

    try:
        document = load(read_bytes(path), str(path))
        kind = kind_of(document)
        model = validate(document, KINDS[kind])
    except InputError as error:
        return list(error.problems)
    if isinstance(model, Sequence):
        return list(resolve(Loaded(model, document, path), today).problems)
    if isinstance(model, Bench):
        try:
            load_dialects(Loaded(model, document, path), model.instruments)
        except InputError as error:
            return list(error.problems)
    if isinstance(model, KitFile):
        problems = measured_standards(Loaded(model, document, path))[1]
        if model.due and model.due < today:
            text = f"the kit was due for calibration on {model.due}"
            problems.append(document.problem(text, ("due",), "Have it calibrated, or use another kit."))
        return problems
    return []
