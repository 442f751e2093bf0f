"""Names with wildcards, as designers write them in briefs and process files.

Only ``*`` and ``?`` are wild, because brackets are part of bus names; case never matters.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from evenstage.source import Span


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

    @cached_property
    def _regex(self) -> re.Pattern[str]:
        wild = {"*": ".*", "?": "."}
        return re.compile("".join(wild.get(c, re.escape(c)) for c in self.text), re.I | re.S)

    def fits(self, name: str) -> bool:
        """Tell whether the whole name matches."""
        return self._regex.fullmatch(name) is not None
