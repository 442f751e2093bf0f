"""Names with wildcards, as designers write them in briefs and process files.

Only ``*`` and ``?`` are wild, because brackets are part of bus names; case never matters.
"""

from __future__ import annotations

import difflib
import re
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Final

from evenstage.errors import SettingsError

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from evenstage.source import Span

_WILD: Final = re.compile(r"[*?]")

#: Comparing a name with its likes takes some 10 us, so a wrong pattern meets at most this many.
_NAMES_COMPARED: Final = 20_000


@dataclass(frozen=True)
class Pattern:
    """A name, perhaps with wildcards, and where the user wrote it.

    Parameters
    ----------
    text : str
        As written; ``*`` stands for any run of characters, ``?`` for one.
    span : Span, optional
        Where it was written, for messages.

    Examples
    --------
    >>> Pattern("xrow?.xdrv[*]").fits("XROW3.xdrv[12]")
    True
    """

    text: str
    span: Span | None = None

    @property
    def is_plain(self) -> bool:
        """Whether it holds no wildcard."""
        return not _WILD.search(self.text)

    @cached_property
    def _regex(self) -> re.Pattern[str]:
        wild = {"*": ".*", "?": "."}
        text = self.text.lower()
        return re.compile("".join(wild.get(c, re.escape(c)) for c in text), re.DOTALL)

    def fits(self, name: str) -> bool:
        """Tell whether the whole name matches."""
        return self._regex.fullmatch(name.lower()) is not None

    def fitting(self, lower_names: Iterable[str]) -> list[int]:
        """Return the indices of those names, all in lower case, that match."""
        matches = self._regex.fullmatch
        return [index for index, name in enumerate(lower_names) if matches(name)]


def select(patterns: Sequence[Pattern], names: Sequence[str], what: str) -> list[int]:
    """Return the indices of the names that at least one pattern fits.

    Parameters
    ----------
    patterns : Sequence of Pattern
        As the user wrote them; each must fit something.
    names : Sequence of str
        What there is.
    what : str
        What the names stand for in messages, such as ``net``.

    Returns
    -------
    list of int
        In increasing order, each once.

    Raises
    ------
    SettingsError
        If a pattern fits no name (code ``pattern-matches-nothing``).

    Examples
    --------
    >>> select([Pattern("a*"), Pattern("b0")], ["A0", "a1", "b0", "b1"], "net")
    [0, 1, 2]
    """
    lower_names = [name.lower() for name in names]
    places: dict[str, list[int]] = {}
    if any(pattern.is_plain for pattern in patterns):
        for index, name in enumerate(lower_names):
            places.setdefault(name, []).append(index)
    found: set[int] = set()
    for pattern in patterns:
        plain = places.get(pattern.text.lower(), [])
        fitting = plain if pattern.is_plain else pattern.fitting(lower_names)
        if not fitting:
            raise _matches_nothing(pattern, names, what)
        found.update(fitting)
    return sorted(found)


def _matches_nothing(pattern: Pattern, names: Iterable[str], what: str) -> SettingsError:
    near = nearest_names(pattern.text, names)
    advice = f"; the nearest are {', '.join(near)}" if near else ""
    return SettingsError(
        f"no {what} fits {pattern.text!r}{advice}",
        code="pattern-matches-nothing",
        span=pattern.span,
    )


def nearest_names(text: str, names: Iterable[str], count: int = 3) -> list[str]:
    """Return the names most like a text, the most similar first; wildcards in it do not count.

    Parameters
    ----------
    text : str
        A name nobody knows.
    names : Iterable of str
        Those that exist; of very many, only the ones that begin alike are compared.
    count : int
        How many to return at most.

    Examples
    --------
    >>> nearest_names("wl<8>", ["wl<0>", "clk", "WL<80>"])
    ['WL<80>', 'wl<0>']
    """
    wanted = _WILD.sub("", text).lower()
    known = {name.lower(): name for name in sorted(set(names), reverse=True)}
    if len(known) > _NAMES_COMPARED:
        known = {low: name for low, name in known.items() if low[:1] == wanted[:1]}
    compared = sorted(known)[:_NAMES_COMPARED]
    return [known[low] for low in difflib.get_close_matches(wanted, compared, n=count)]
