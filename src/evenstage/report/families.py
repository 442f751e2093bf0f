"""Names that differ in numbers only, put under one name."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from collections.abc import Sequence

_NUMBER: Final = re.compile(r"(\d+)", re.ASCII)

#: A list of more ranges than this is told by a star.
_RUNS_SHOWN: Final = 3


def family_of(name: str) -> str:
    """Return what names that differ in numbers only have in common."""
    return _NUMBER.sub("*", name)


def family_name(members: Sequence[str]) -> str:
    """Return one name for members of one family.

    Where one number differs it is a list with ranges, as on a bus; a star stands for a long list,
    and for numbers that differ in several places.

    Parameters
    ----------
    members : sequence of str
        At least one; all with the same ``family_of``.

    Examples
    --------
    >>> family_name(["xrow[3].xi1", "xrow[4].xi1", "xrow[5].xi1", "xrow[9].xi1"])
    'xrow[3:5,9].xi1'
    """
    split = [_NUMBER.split(member) for member in members]
    parts = [list(dict.fromkeys(part)) for part in zip(*split, strict=True)]
    differing = sum(len(part) > 1 for part in parts)
    return "".join(
        part[0] if len(part) == 1 else "*" if differing > 1 else _numbers(part) for part in parts
    )


def _numbers(texts: Sequence[str]) -> str:
    """Return numbers as a list with ranges, or a star where that is long."""
    if any(text != str(int(text)) for text in texts):
        return "*"
    runs: list[list[int]] = []
    for number in sorted(map(int, texts)):
        if runs and number == runs[-1][-1] + 1:
            runs[-1].append(number)
        else:
            runs.append([number])
    listed = ",".join(_run(run) for run in runs)
    return listed if len(runs) <= _RUNS_SHOWN else "*"


def _run(numbers: Sequence[int]) -> str:
    if len(numbers) < 3:
        return ",".join(map(str, numbers))
    return f"{numbers[0]}:{numbers[-1]}"


def gathered(names: Sequence[str], times: str) -> list[str]:
    """Return names, families of several in one text such as ``20 x xspare0:19``.

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
