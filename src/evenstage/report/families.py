"""Names that differ in numbers only, put under one name with a star for the numbers."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from collections.abc import Sequence

_NUMBER: Final = re.compile(r"(\d+)", re.ASCII)


def family_of(name: str) -> str:
    """Return what names that differ in numbers only have in common."""
    return _NUMBER.sub("*", name)


def family_name(members: Sequence[str]) -> str:
    """Return one name for members of one family; a star where their numbers differ.

    Parameters
    ----------
    members : sequence of str
        At least one; all with the same ``family_of``.

    Examples
    --------
    >>> family_name(["xrow[3].xi1", "xrow[14].xi1"])
    'xrow[*].xi1'
    """
    split = [_NUMBER.split(member) for member in members]
    parts = zip(*split, strict=True)
    return "".join(part[0] if len(set(part)) == 1 else "*" for part in parts)


def gathered(names: Sequence[str], times: str) -> list[str]:
    """Return names, families of several in one text such as ``20 x xspare*``.

    Parameters
    ----------
    names : sequence of str
    times : str
        The sign between a number and a family.
    """
    families: dict[str, list[str]] = {}
    for name in names:
        families.setdefault(family_of(name), []).append(name)
    return [
        group[0] if len(group) == 1 else f"{len(group)} {times} {family_name(group)}"
        for group in families.values()
    ]
