"""From names to files: beside the file that uses them, then ./sequences, then installed."""

from __future__ import annotations

import pytest

from benchrun.errors import InputError, Problem
from benchrun.sequence.find import find, named


def test_installed_names_are_found(installed, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    assert find("sequence", "harmonic-filter") == installed / "harmonic-filter.yaml"
    assert find("kit", "n50-workshop") == installed / "kits" / "n50-workshop.yaml"
    assert "workshop" in dict(named("bench"))


def test_what_lies_nearer_wins(installed, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    beside, local = tmp_path / "mine", tmp_path / "sequences"
    for folder in (beside, local):
        (folder / "kits").mkdir(parents=True)
    (local / "kits" / "n50-workshop.yaml").touch()
    assert find("kit", "n50-workshop").resolve() == local / "kits" / "n50-workshop.yaml"
    (beside / "n50-workshop.yaml").touch()
    assert find("kit", "n50-workshop", beside) == beside / "n50-workshop.yaml"


def test_a_path_is_taken_as_it_is(tmp_path):
    file = tmp_path / "some.yaml"
    file.touch()
    assert find("sequence", str(file)) == file


@pytest.mark.parametrize("name", ["nothing", "", "x" * 5000, "a\x00b", "../../etc/passwd", "kits", "."])
def test_an_unknown_name_is_told_where_it_was_used(name):
    with pytest.raises(InputError, match=r"^f\.yaml:3:9: there is no kit") as caught:
        find("kit", name, place=Problem("", "f.yaml", 3, 9))
    assert caught.value.problems[0].advice


def test_the_nearest_name_is_offered():
    with pytest.raises(InputError, match="Did you mean 'harmonic-filter'"):
        find("sequence", "harmonic-filtre")
