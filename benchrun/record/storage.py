"""The file system as a seam: the operations of which a record is made."""

from __future__ import annotations

import os
import shutil
from pathlib import Path
from typing import Protocol

__all__ = ["DISK", "Disk", "Storage"]


class Storage(Protocol):
    """Where records are written. Every operation may raise OSError."""

    def make_dir(self, path: Path) -> None:
        """Make a folder, its parents too; nothing happens if it is there."""
        ...

    def write_file(self, path: Path, content: bytes) -> None:
        """Write a new file and bring it to the medium; FileExistsError if it is there."""
        ...

    def share_file(self, path: Path, content: bytes, twin: Path) -> bool:
        """Give a file that is on the medium already a second name; False if that cannot be, or it differs."""
        ...

    def sync(self, folder: Path) -> None:
        """Bring a folder's list of names to the medium."""
        ...

    def rename(self, source: Path, target: Path) -> None:
        """Rename a folder at one blow; OSError if a file or a filled folder has that name."""
        ...

    def remove_tree(self, path: Path) -> None:
        """Remove a folder with all it holds; nothing happens if it is gone."""
        ...


class Disk:
    """The machine's own file system."""

    def make_dir(self, path: Path) -> None:
        """Make a folder, its parents too."""
        path.mkdir(parents=True, exist_ok=True)

    def write_file(self, path: Path, content: bytes) -> None:
        """Write a new file and bring it to the medium."""
        with path.open("xb") as file:
            file.write(content)
            file.flush()
            os.fsync(file.fileno())

    def share_file(self, path: Path, content: bytes, twin: Path) -> bool:
        """Give a file that is on the medium already a second name (a hard link)."""
        try:
            path.hardlink_to(twin)
        except OSError:  # another file system, one without links, or the twin is gone
            return False
        # Believe the bytes, not the name: somebody may have changed the twin since it was written.
        if path.read_bytes() == content:
            return True
        path.unlink()
        return False

    def sync(self, folder: Path) -> None:
        """Bring a folder's list of names to the medium; Windows does this by itself."""
        if os.name == "nt":
            return
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)

    def rename(self, source: Path, target: Path) -> None:
        """Rename a folder at one blow."""
        # Path.replace would silently take the place of a file; os.rename of a folder cannot.
        os.rename(source, target)  # noqa: PTH104

    def remove_tree(self, path: Path) -> None:
        """Remove a folder with all it holds."""
        if path.exists():
            shutil.rmtree(path)


DISK = Disk()
"""The usual storage."""
