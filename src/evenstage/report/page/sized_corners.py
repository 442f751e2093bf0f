"""How a block sized for several corners does in each."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.report.page.parts import Heading, Section, Table, cells
from evenstage.report.sized_corners import remark, sized_corner_rows

if TYPE_CHECKING:
    from evenstage.sizing.results import SizedCorners


def sized_corner_section(corners: SizedCorners) -> Section:
    """Return the latest path of each corner before and after."""
    (_, *titles), rows = sized_corner_rows(corners)
    headings = (Heading("corner"), *(Heading(title, "number") for title in titles))
    lines = tuple(cells(*row) for row in rows)
    table = Table("The latest path in each corner", headings, lines, remark=remark(corners))
    return Section("corners", "Corners", (table,))
