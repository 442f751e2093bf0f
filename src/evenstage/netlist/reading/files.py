"""Reads files whole, and only what is a file."""

from __future__ import annotations

import errno
import os
import stat
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from pathlib import Path


def read_file(path: Path) -> bytes:
    """Return the bytes of a regular file, as many as it had when it was opened.

    A pipe or a device might never end, a file may grow while it is read: neither holds us up.

    Raises
    ------
    OSError
        If there is no such file, or it cannot be read.
    ValueError
        If the path cannot be one.
    """
    descriptor = os.open(path, os.O_RDONLY | getattr(os, "O_NONBLOCK", 0))
    with open(descriptor, "rb") as file:  # noqa: PTH123 - a descriptor, not a path
        status = os.fstat(descriptor)
        if stat.S_ISDIR(status.st_mode):
            raise IsADirectoryError(errno.EISDIR, os.strerror(errno.EISDIR))
        if not stat.S_ISREG(status.st_mode):
            raise OSError(errno.EINVAL, "not a regular file")
        return file.read(status.st_size)


def why_not(error: OSError | ValueError) -> str:
    """Return why a file cannot be read, in words."""
    return (getattr(error, "strerror", None) or "not a file name").lower()
