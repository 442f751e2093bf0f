"""Columns of text: names give way when the line is too short, numbers never do."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final, Literal

from evenstage.report.paper import cells

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.paper import Paper

#: A name keeps at least this many cells.
_LEAST_NAME: Final = 4

#: A chart that even the shortest names leave too little room is drawn in this many cells.
_LEAST_CHART: Final = 6

#: A name of which this many cells are left can still be read.
_READABLE: Final = 15


@dataclass(frozen=True, slots=True)
class Column:
    """How one column behaves.

    Parameters
    ----------
    title : str
    align : {"left", "right"}
    kind : {"number", "name", "chart"}
        A number keeps its room, a name is shortened in the middle, a chart takes what is left.
    least, most : int
        Cells of a chart.
    before : int
        Blanks before the column, unless it is the first.
    """

    title: str
    align: Literal["left", "right"] = "left"
    kind: Literal["number", "name", "chart"] = "number"
    least: int = 0
    most: int = 0
    before: int = 2


@dataclass(frozen=True, slots=True)
class Table:
    """Columns with their widths settled.

    Parameters
    ----------
    paper : Paper
    columns : tuple of Column
    widths : tuple of int
        Cells per column.
    indent : int
        Cells before the first column.
    """

    paper: Paper
    columns: tuple[Column, ...]
    widths: tuple[int, ...]
    indent: int = 0

    def line(self, *texts: str) -> str:
        """Return one row as a line without trailing blanks."""
        fields = zip(texts, self.columns, self.widths, strict=True)
        padded = (" " * c.before + _padded(self._fitted(text, c, w), c, w) for text, c, w in fields)
        return (" " * self.indent + "".join(padded)[self.columns[0].before :]).rstrip()

    def _fitted(self, text: str, column: Column, width: int) -> str:
        return self.paper.shorten(text, width) if column.kind == "name" else self.paper.shown(text)

    def is_readable(self, rows: Sequence[Sequence[str]]) -> bool:
        """Whether all fits and every name is whole or has kept enough to be known by."""
        if self.start(len(self.columns) - 1) + self.widths[-1] > self.paper.width:
            return False
        names = [index for index, column in enumerate(self.columns) if column.kind == "name"]
        return all(
            self.widths[index] >= min(cells(self.paper.shown(row[index])), _READABLE)
            for row in rows
            for index in names
        )

    def titles(self) -> str:
        """Return the line of titles."""
        return self.line(*(column.title for column in self.columns))

    def lines(self, rows: Sequence[Sequence[str]]) -> list[str]:
        """Return titles and rows."""
        return [self.titles(), *(self.line(*row) for row in rows)]

    def start(self, index: int) -> int:
        """Return the cell in which a column begins."""
        before = sum(column.before for column in self.columns[1 : index + 1])
        return self.indent + sum(self.widths[:index]) + before


def lay_out(
    paper: Paper, columns: Sequence[Column], rows: Sequence[Sequence[str]], *, indent: int = 0
) -> Table:
    """Settle column widths for the rows to be printed.

    Parameters
    ----------
    paper : Paper
    columns : sequence of Column
    rows : sequence of sequence of str
        One text per column; the texts of a chart column do not count.
    indent : int
    """
    natural = [_natural(paper, column, index, rows) for index, column in enumerate(columns)]
    blanks = sum(column.before for column in columns[1:])
    room = paper.width - indent - blanks - sum(natural)
    names = [index for index, column in enumerate(columns) if column.kind == "name"]
    widths = list(natural)
    if room < 0:
        cap = _cap([natural[index] for index in names], sum(natural[i] for i in names) + room)
        for index in names:
            widths[index] = min(natural[index], cap)
    room += sum(natural) - sum(widths)
    for index, column in enumerate(columns):
        if column.kind == "chart":
            widths[index] = max(min(column.least + room, column.most), _LEAST_CHART)
    return Table(paper, tuple(columns), tuple(widths), indent)


def first_that_fits(
    paper: Paper,
    choices: Sequence[tuple[Sequence[Column], Sequence[Sequence[str]]]],
    *,
    indent: int = 0,
) -> tuple[int, Table]:
    """Return the first choice of columns and rows that leaves names readable, else the last.

    Parameters
    ----------
    paper : Paper
    choices : sequence of (columns, rows)
        Best first.
    indent : int

    Returns
    -------
    index : int
        Which choice it is.
    table : Table
    """
    for index, (columns, rows) in enumerate(choices):
        table = lay_out(paper, columns, rows, indent=indent)
        if table.is_readable(rows) or index == len(choices) - 1:
            return index, table
    raise AssertionError("no choice of columns was given")


def _natural(paper: Paper, column: Column, index: int, rows: Sequence[Sequence[str]]) -> int:
    """Return the cells a column would like to have."""
    if column.kind == "chart":
        return column.least
    texts = [column.title, *(row[index] for row in rows)]
    return max(cells(paper.shown(text)) for text in texts)


def _cap(naturals: Sequence[int], room: int) -> int:
    """Return the largest width at which names capped to it fit together."""
    cap = max(naturals, default=0)
    while cap > _LEAST_NAME and sum(min(natural, cap) for natural in naturals) > room:
        cap -= 1
    return cap


def _padded(text: str, column: Column, width: int) -> str:
    blanks = " " * (width - cells(text))
    return blanks + text if column.align == "right" else text + blanks
