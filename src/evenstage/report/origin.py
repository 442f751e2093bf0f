"""Where a result comes from: the program, what it was asked, what it read, the process."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from evenstage.process.process import Process


@dataclass(frozen=True, slots=True)
class FileDigest:
    """A file that was read or written, as the user named it, and its SHA-256 in hexadecimal."""

    name: str
    sha256: str


@dataclass(frozen=True, slots=True)
class Origin:
    """Where a result comes from.

    Parameters
    ----------
    version : str
        Of the program.
    arguments : tuple of str
        Of the command line, without the program's name.
    files : tuple of FileDigest
    process : Process, optional
        Whose constants were used.
    """

    version: str
    arguments: tuple[str, ...]
    files: tuple[FileDigest, ...]
    process: Process | None = None
