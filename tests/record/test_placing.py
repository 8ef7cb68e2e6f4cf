"""Small files appear whole, and never in the place of another by accident."""

from __future__ import annotations

import errno
import os
import stat
from pathlib import Path

import pytest

from benchrun.errors import RecordError
from benchrun.record.placing import exists, place_new, place_over, read_bytes


def no_links(source: Path, target: Path) -> None:
    """As on a file system that has no hard links."""
    raise OSError(errno.EPERM, "Operation not permitted")


@pytest.mark.parametrize("link", [os.link, no_links], ids=["links", "no links"])
def test_first_one_wins(tmp_path: Path, link: object) -> None:
    """The second is told so, the file stays, and nothing else is left; with links or without."""
    path = tmp_path / "keys" / "x.pem"
    assert place_new(path, b"first", private=True, link=link)  # type: ignore[arg-type]
    assert not place_new(path, b"second", private=True, link=link)  # type: ignore[arg-type]
    assert path.read_bytes() == b"first"
    assert os.name == "nt" or stat.S_IMODE(path.stat().st_mode) == 0o600
    assert list(path.parent.iterdir()) == [path]


def test_place_without_links_that_refuses_the_file_is_said(tmp_path: Path) -> None:
    """The folder went away meanwhile: a clear error."""

    def vanish(source: Path, target: Path) -> None:
        source.unlink()
        source.parent.rmdir()
        raise OSError(errno.EPERM, "Operation not permitted")

    with pytest.raises(RecordError, match=r"x\.pem could not be written: No such file"):
        place_new(tmp_path / "keys" / "x.pem", b"first", link=vanish)


def test_former_file_is_replaced(tmp_path: Path) -> None:
    """At one blow, without a remainder."""
    path = tmp_path / "trusted" / "x.json"
    place_over(path, b"first")
    place_over(path, b"second")
    assert path.read_bytes() == b"second"
    assert list(path.parent.iterdir()) == [path]


def test_folder_in_the_way_is_said(tmp_path: Path) -> None:
    """And left alone, without a remainder."""
    (tmp_path / "x.json").mkdir()
    with pytest.raises(RecordError, match=r"x\.json could not be written: .* BENCHRUN_HOME"):
        place_over(tmp_path / "x.json", b"text")
    assert list(tmp_path.iterdir()) == [tmp_path / "x.json"]


def test_what_the_system_refuses_is_said(tmp_path: Path) -> None:
    """A folder cannot be read as a file, and a name can be too long to ask for."""
    with pytest.raises(RecordError, match="cannot be read: "):
        read_bytes(tmp_path)
    with pytest.raises(RecordError, match="cannot be reached: File name too long"):
        exists(tmp_path / ("x" * 5000))
