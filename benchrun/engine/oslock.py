"""An exclusive lock on an open file, which the system takes back when its holder ends, however it ends."""

from __future__ import annotations

import os
import sys

__all__ = ["hold"]

_FAR = 1 << 40
"""Windows keeps others even from reading a locked byte, so a byte is locked that no file reaches."""


def hold(handle: int) -> bool:
    """Lock an open file for as long as the handle is open.

    Parameters
    ----------
    handle
        File descriptor, open for writing.

    Returns
    -------
    bool
        False if somebody else holds it.

    Raises
    ------
    OSError
        If the file system knows no locks.
    """
    try:
        if sys.platform == "win32":
            import msvcrt

            before = os.lseek(handle, 0, os.SEEK_CUR)
            os.lseek(handle, _FAR, os.SEEK_SET)
            try:
                msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
            finally:
                os.lseek(handle, before, os.SEEK_SET)
        else:
            import fcntl

            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except (BlockingIOError, PermissionError):
        return False
    return True
