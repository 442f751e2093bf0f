"""Values of cards to be written anew, and the edits that do it and say so."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from evenstage.netlist.rewriting.comments import card_line, comment_above
from evenstage.netlist.rewriting.edits import Edit

if TYPE_CHECKING:
    from collections.abc import Iterable
    from pathlib import Path

    from evenstage.source import Span


@dataclass(frozen=True, slots=True, kw_only=True)
class Respelling:
    """One value of one card.

    Parameters
    ----------
    span : Span
        The bytes replaced; empty where ``name=value`` is added after the card's last value.
    name : str
        The parameter, as the card writes it; empty where a word is replaced.
    old, new : str
        The values as text; ``old`` is what counts so far where the card does not give it.
    why : str
        For the comment above the card.
    card : str
        Name of the transistor card whose width this is about.
    follows : bool
        Whether the value merely follows another one; it is then left out of the comment.
    detail : str
        More for the comment.
    """

    span: Span
    name: str
    old: str
    new: str
    why: str
    card: str = ""
    follows: bool = False
    detail: str = ""

    @property
    def edit(self) -> Edit:
        """The edit that writes the value."""
        added = self.span.start == self.span.end
        text = f" {self.name}={self.new}" if added else self.new
        return Edit(self.span, text.encode("utf-8", "surrogateescape"))

    @property
    def note(self) -> str:
        """What the comment says."""
        return f"{self.name} {self.old} -> {self.new}{self.detail}".lstrip()


def edits_of(respellings: Iterable[Respelling]) -> list[Edit]:
    """Return the edits for some values, with one comment above each card concerned."""
    on_line: dict[tuple[Path, int], list[Respelling]] = {}
    for respelling in respellings:
        source = respelling.span.source
        line = card_line(source.data, respelling.span.start)
        on_line.setdefault((source.path, line), []).append(respelling)
    return [
        edit
        for group in on_line.values()
        for edit in (_comment(group), *(respelling.edit for respelling in group))
    ]


def _comment(group: list[Respelling]) -> Edit:
    """Return the comment above one card."""
    ordered = sorted(group, key=lambda r: (r.span.start, r.span.end))
    told = [r for r in ordered if not r.follows] or ordered
    notes = ", ".join(r.note for r in told)
    whys = "; ".join(dict.fromkeys(r.why for r in told if r.why))
    first = ordered[0].span
    return comment_above(first.source, first.start, f"{notes}: {whys}" if whys else notes)
