"""What a page is made of: sections with paragraphs, pictures and tables."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

if TYPE_CHECKING:
    from evenstage.report.page.element import Element


@dataclass(frozen=True, slots=True)
class Paragraph:
    """Some sentences, or a command; ``label`` stands before them in bold."""

    text: str
    label: str = ""
    command: bool = False
    kind: Literal["paragraph"] = "paragraph"


@dataclass(frozen=True, slots=True)
class Figure:
    """Drawings beside each other, wrapped where there is no room, above their caption."""

    drawings: tuple[Element, ...]
    caption: str
    legend: tuple[Element, ...] = ()
    kind: Literal["figure"] = "figure"


@dataclass(frozen=True, slots=True)
class Heading:
    """The head of a column; ``axis`` is drawn under its title."""

    title: str
    align: Literal["text", "name", "number", "chart", "digest"] = "text"
    axis: Element | None = None


@dataclass(frozen=True, slots=True)
class Cell:
    """A cell: text or a drawing, and what it is sorted by where that is not its text."""

    text: str = ""
    drawing: Element | None = None
    sort: str = ""


@dataclass(frozen=True, slots=True)
class Table:
    """A table with its caption.

    The first cell of each row tells what it is about: by a name of the netlist where ``names``.
    """

    caption: str
    headings: tuple[Heading, ...]
    rows: tuple[tuple[Cell, ...], ...]
    legend: tuple[Element, ...] = ()
    remark: str = ""
    sortable: bool = False
    names: bool = True
    kind: Literal["table"] = "table"

    @property
    def charted(self) -> bool:
        """Whether a column of drawings wants all the width there is."""
        return any(heading.align == "chart" for heading in self.headings)


Part = Paragraph | Figure | Table


@dataclass(frozen=True, slots=True)
class Section:
    """A part of the page with a title that links can lead to."""

    name: str
    title: str
    parts: tuple[Part, ...]


@dataclass(frozen=True, slots=True)
class KeyFigure:
    """One of the few numbers at the head of the page."""

    label: str
    value: str
    remark: str = ""


@dataclass(frozen=True, slots=True)
class Page:
    """A whole page.

    Parameters
    ----------
    subject : str
        The block and its file.
    kind : str
        What was done, as in ``resizing``.
    answer : str
        The answer in a sentence or two.
    figures : tuple of KeyFigure
    cautions : tuple of str
        What takes away from every time on the page.
    notices : tuple of (str, tuple of str)
        What they are about, and what they say.
    sections : tuple of Section
        Those without parts are left out.
    """

    subject: str
    kind: str
    answer: str
    figures: tuple[KeyFigure, ...]
    cautions: tuple[str, ...]
    notices: tuple[tuple[str, tuple[str, ...]], ...]
    sections: tuple[Section, ...]


def cells(*texts: str) -> tuple[Cell, ...]:
    """Return a row of texts."""
    return tuple(Cell(text) for text in texts)
