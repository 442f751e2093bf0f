"""Widths that differ between two netlists, as a table."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.change_text import factor
from evenstage.report.families import family_name, family_of
from evenstage.report.scale import Scale
from evenstage.report.table import Column, first_that_fits

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.paper import Paper
    from evenstage.timing.results import WidthDifference

_SHOWN: Final = 40


def difference_lines(paper: Paper, widths: Sequence[WidthDifference]) -> list[str]:
    """Return widths that differ, instances that differ in numbers only in one line."""
    families: dict[tuple[str, str, str, float | None, float | None], list[WidthDifference]] = {}
    for width in widths:
        key = (family_of(width.instance), width.card, width.model, width.before, width.after)
        families.setdefault(key, []).append(width)
    if not families:
        return []
    known = [value for w in widths for value in (w.before, w.after) if value is not None]
    scale = Scale.of(known, "m")
    rows = [_difference_row(paper, group, scale) for group in families.values()]
    columns = [
        Column("instance", kind="name"),
        Column("", before=1),
        Column("card", kind="name"),
        Column("model", kind="name"),
        Column("before", align="right"),
        Column("after", align="right"),
        Column("factor", align="right"),
    ]
    shown = rows[:_SHOWN]
    _, table = first_that_fits(paper, [(columns, shown)], indent=2)
    lines = [table.titles(), table.line("", "", "", "", scale.unit, scale.unit, "")]
    lines += [table.line(*row) for row in shown]
    if len(shown) < len(rows):
        lines.append(f"  and {len(rows) - len(shown)} more, all of them in the JSON")
    return lines


def _difference_row(paper: Paper, group: Sequence[WidthDifference], scale: Scale) -> list[str]:
    width = group[0]
    return [
        family_name([member.instance for member in group]) or "(top)",
        f"{paper.times}{len(group)}" if len(group) > 1 else "",
        width.card,
        width.model,
        "-" if width.before is None else scale.number(width.before),
        "-" if width.after is None else scale.number(width.after),
        factor(paper, width.before, width.after) if width.before and width.after else "",
    ]
