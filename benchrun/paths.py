"""Where the installed data lies: sequences, kits, masks, fixtures, benches, dialects."""

from __future__ import annotations

from pathlib import Path

__all__ = ["installed_sequences"]


def installed_sequences() -> Path:
    """Folder of the named sequences that come with the package.

    In an installed package they lie inside it; in a checkout beside it.

    Returns
    -------
    pathlib.Path
        The folder; it holds ``kits/``, ``masks/``, ``fixtures/`` and ``benches/`` too.
    """
    package = Path(__file__).resolve().parent
    inside = package / "sequences"
    return inside if inside.is_dir() else package.parent / "sequences"
