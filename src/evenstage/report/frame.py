"""What every report has alike: subject and answer before, notices and caution behind."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

from evenstage.process.generic import GENERIC_NOTICE
from evenstage.report.families import gathered
from evenstage.report.words import listed, section

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from evenstage.errors import Notice
    from evenstage.report.paper import Paper

_MESSAGES_SHOWN: Final = 3
_NAMES_SHOWN: Final = 5

CAUTION: Final = (
    "An estimate from resistances and capacitances, not sign-off: simulate at all corners with the "
    "foundry's models. Electromigration, noise, hold and reliability limits are not checked. "
    "Follow your organisation's review and local rules, above all where a failure of the circuit "
    "can hurt someone."
)


def framed(
    paper: Paper,
    subject: Sequence[str],
    answer: str,
    lines: Sequence[str],
    notices: Iterable[Notice],
) -> str:
    """Return a whole report.

    Parameters
    ----------
    paper : Paper
    subject : sequence of str
        Lines that say what was looked at.
    answer : str
        What to know first.
    lines : sequence of str
        The sections.
    notices : iterable of Notice
        Those that take away from every time stand before the sections, the others behind.

    Returns
    -------
    str
        Lines without trailing blanks, the last one ended too.
    """
    rough, others = cautions(notices)
    head = [*subject, *([""] if subject else []), *paper.paragraph(answer)]
    for notice in rough:
        head += ["", *paper.paragraph(f"Caution: {notice}.")]
    foot = section("Notices", notice_lines(paper, others)) if paper.notices else []
    return "\n".join([*head, *lines, *foot, "", *paper.paragraph(CAUTION)]) + "\n"


def cautions(notices: Iterable[Notice]) -> tuple[list[Notice], list[Notice]]:
    """Return notices, each once: those that take away from every time, and the others."""
    every = list(dict.fromkeys(notices))
    rough = [notice for notice in every if notice.code == GENERIC_NOTICE]
    return rough, [notice for notice in every if notice.code != GENERIC_NOTICE]


def notice_lines(paper: Paper, notices: Iterable[Notice]) -> list[str]:
    """Return notices grouped by what they are about, with their number."""
    groups: dict[str, list[Notice]] = {}
    for notice in dict.fromkeys(notices):
        groups.setdefault(notice.code, []).append(notice)
    return [line for code, group in groups.items() for line in _group_lines(paper, code, group)]


def _group_lines(paper: Paper, code: str, group: Sequence[Notice]) -> list[str]:
    if len(group) == 1:
        return paper.paragraph(f"{code}: {_told(paper, group[0])}", indent=2, hanging=4)
    lines = paper.paragraph(f"{code}, {len(group)} times", indent=2)
    shown = group if len(group) == _MESSAGES_SHOWN + 1 else group[:_MESSAGES_SHOWN]
    for notice in shown:
        lines += paper.paragraph(_told(paper, notice), indent=4, hanging=6)
    if len(shown) < len(group):
        lines.append(f"    and {len(group) - len(shown)} more")
    return lines


def _told(paper: Paper, notice: Notice) -> str:
    """Return a notice with the first of the names it is about, unless it names them itself."""
    names = [name for name in notice.names if name]
    if not names or any(_names(notice.message, name) for name in names):
        return str(notice)
    return f"{notice}: {listed(gathered(names, paper.times), _NAMES_SHOWN)}"


def _names(message: str, name: str) -> bool:
    """Tell whether a message names something; a single letter could be any word's."""
    word = rf"(?<![\w.]){re.escape(name)}(?![\w.])"
    return f"'{name}'" in message or (len(name) > 1 and bool(re.search(word, message)))
