"""Documents tell the truth: examples in docstrings run, and the README shows what the code holds."""

from __future__ import annotations

import doctest
import importlib
import pkgutil
import re
import subprocess
from pathlib import Path

import pytest

import benchrun
import sim_instruments
from benchrun.record.openssl_lines import LINES

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
GUIDE = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
MODULES = sorted(
    info.name
    for package in (benchrun, sim_instruments)
    for info in pkgutil.walk_packages(package.__path__, f"{package.__name__}.")
    if not info.name.endswith("__main__")
)


@pytest.mark.parametrize("name", MODULES)
def test_examples_in_docstrings_run(name: str, monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("BENCHRUN_HOME", str(tmp_path / "home"))
    result = doctest.testmod(importlib.import_module(name))
    assert result.failed == 0


def test_enough_examples_are_there() -> None:
    finder = doctest.DocTestFinder(exclude_empty=True)
    count = sum(len(test.examples) for name in MODULES for test in finder.find(importlib.import_module(name)))
    assert count > 80


def test_readme_shows_the_openssl_lines() -> None:
    assert LINES in README


def test_readme_sequence_is_part_of_the_installed_one() -> None:
    shown = re.search(r"```yaml\n(.*?)```", README, re.S)
    assert shown is not None
    installed = (ROOT / "sequences" / "harmonic-filter.yaml").read_text(encoding="utf-8").splitlines()
    missing = [line for line in shown[1].splitlines() if line not in installed]
    assert missing == []


def test_links_lead_to_files() -> None:
    for text in (README, GUIDE):
        for target in re.findall(r"\]\(([^)#:]+)\)", text):
            assert (ROOT / target).exists(), target


def test_paths_named_in_the_guide_exist() -> None:
    named = re.findall(
        r"`((?:sim_instruments|tests|sequence|evaluate|engine|record|instruments|rf|cli)/[\w/.]*)`", GUIDE
    )
    assert named
    for path in named:
        if "KIND" not in path:
            assert (ROOT / path).exists() or (ROOT / "benchrun" / path).exists(), path


def test_top_level_holds_the_set_layout_only() -> None:
    listed = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=False)
    if listed.returncode:
        pytest.skip("not a git checkout, so what is tracked is not known")
    allowed = {
        "README.md",
        "DEVELOPERS.md",
        "pyproject.toml",
        "benchrun",
        "sequences",
        "tests",
        "sim_instruments",
    }
    top = {line.split("/", 1)[0] for line in listed.stdout.splitlines()}
    assert {name for name in top if not name.startswith(".")} <= allowed


def test_versions_agree() -> None:
    project = (ROOT / "pyproject.toml").read_text(encoding="utf-8")
    assert f'version = "{benchrun.__version__}"' in project
