"""A page put together: its sections, and what there is to notice about it."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.families import gathered
from evenstage.report.frame import cautions
from evenstage.report.page.parts import Page
from evenstage.report.words import listed

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from evenstage.errors import Notice
    from evenstage.report.page.parts import KeyFigure, Section

_MESSAGES_SHOWN: Final = 5
_NAMES_SHOWN: Final = 8


def assembled(
    *,
    subject: str,
    kind: str,
    answer: str,
    figures: tuple[KeyFigure, ...],
    notices: Iterable[Notice],
    sections: Sequence[Section],
) -> Page:
    """Return a page; notices that take away from every time become cautions at its head."""
    rough, others = cautions(notices)
    return Page(
        subject=subject,
        kind=kind,
        answer=answer,
        figures=figures,
        cautions=tuple(f"{str(notice)[:1].upper()}{str(notice)[1:]}." for notice in rough),
        notices=_notices(others),
        sections=tuple(section for section in sections if section.parts),
    )


def _notices(notices: Iterable[Notice]) -> tuple[tuple[str, tuple[str, ...]], ...]:
    """Return notices by what they are about; of very many alike the first ones."""
    groups: dict[str, list[Notice]] = {}
    for notice in notices:
        groups.setdefault(notice.code, []).append(notice)
    told = []
    for code, group in groups.items():
        words = [_told(notice) for notice in group[:_MESSAGES_SHOWN]]
        if len(group) > _MESSAGES_SHOWN:
            words.append(f"and {len(group) - _MESSAGES_SHOWN} more")
        told.append((code.replace("-", " "), tuple(words)))
    return tuple(told)


def _told(notice: Notice) -> str:
    names = [name for name in notice.names if name and name not in notice.message]
    if not names:
        return str(notice)
    return f"{notice}: {listed(gathered(names, '×'), _NAMES_SHOWN)}"
