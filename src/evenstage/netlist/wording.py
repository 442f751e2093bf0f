"""Pieces of messages that several errors share."""

from __future__ import annotations

from difflib import get_close_matches
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

_SHOWN = 8


def nearest(name: str, known: Iterable[str]) -> str:
    """Return ``; did you mean 'x'?`` for the known name most like a wrong one, or nothing."""
    spelt = {other.lower(): other for other in sorted(known)}
    close = get_close_matches(name.lower(), spelt, n=1, cutoff=0.7)
    return f"; did you mean '{spelt[close[0]]}'?" if close else ""


def listed(names: Sequence[str]) -> str:
    """Return the first few of many names, and how many more there are."""
    shown = ", ".join(f"'{name}'" for name in names[:_SHOWN])
    more = len(names) - _SHOWN
    return f"{shown} and {more} more" if more > 0 else shown


def counted(number: int, noun: str) -> str:
    """Return a number with its noun."""
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"
