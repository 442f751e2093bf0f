"""Precharge as a table of the page."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.page.parts import Heading, Paragraph, Table, cells
from evenstage.report.paper import Paper
from evenstage.report.precharge_text import NOTE, precharge_rows, precharge_scale

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.page.parts import Part
    from evenstage.timing.results import Precharge

_ROWS: Final = 40


def precharge_parts(found: Sequence[Precharge]) -> tuple[Part, ...]:
    """Return the dynamic nodes, latest first; nothing where there are none."""
    if not found:
        return ()
    unit = precharge_scale(found).unit
    headings = (
        Heading("node"),
        Heading("edge"),
        Heading(f"half, {unit}", "number"),
        Heading("whole", "number"),
        Heading("by"),
        Heading("after"),
        Heading("phase"),
    )
    rows = precharge_rows(Paper(unicode=True), found)
    shown = rows[:_ROWS]
    left = len(found) - sum(number for number, _ in shown)
    remark = f"{left} more are in the JSON." if left else ""
    table = tuple(cells(*row) for _, row in shown)
    note = Paragraph(f"{NOTE[0].upper()}{NOTE[1:]}")
    return Table("When dynamic nodes are charged again", headings, table, remark=remark), note
