"""A result read back from where it was written."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.flow.files import origin
from evenstage.report.document.convert import read_document

if TYPE_CHECKING:
    from collections.abc import Sequence
    from pathlib import Path

    from evenstage.report.document.convert import Reviewable
    from evenstage.report.origin import Origin


def report(path: Path, version: str, arguments: Sequence[str]) -> tuple[Reviewable, Origin]:
    """Read a result that another command wrote as JSON, and where it came from.

    Parameters
    ----------
    path : Path
    version, arguments
        Of this run: where the result comes from if it does not say so itself.

    Raises
    ------
    DocumentError
        Where the file is no such result.
    """
    result, known = read_document(path)
    return result, known or origin(version, arguments, [path], result)
