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


_COLUMNS: Final = (
    Column("instance", kind="name"),
    Column("", before=1),
    Column("cards", kind="name"),
    Column("model", kind="name"),
    Column("before", align="right"),
    Column("after", align="right"),
    Column("factor", align="right"),
)

#: The differences of instances that differ in the numbers of their names only.
_Instances = list["WidthDifference"]


def difference_lines(paper: Paper, widths: Sequence[WidthDifference]) -> list[str]:
    """Return widths that differ, one block per instance, instances that differ alike together."""
    if not widths:
        return []
    known = [value for w in widths for value in (w.before, w.after) if value is not None]
    scale = Scale.of(known, "m").trimmed(known)
    blocks = [_rows(paper, instances, scale) for instances in alike_differences(widths)]
    shown = blocks[:_SHOWN]
    rows = [row for block in shown for row in block]
    _, table = first_that_fits(paper, [(_COLUMNS, rows)], indent=2)
    lines = [table.titles(), table.line("", "", "", "", scale.unit, scale.unit, "")]
    lines += [table.line(*row) for row in rows]
    if len(shown) < len(blocks):
        lines.append(f"  and {len(blocks) - len(shown)} such blocks more, all of them in the JSON")
    return lines


def alike_differences(widths: Sequence[WidthDifference]) -> list[_Instances]:
    """Return the differences by instance, instances of one family that differ alike together."""
    instances: dict[str, list[WidthDifference]] = {}
    for width in widths:
        instances.setdefault(width.instance, []).append(width)
    families: dict[tuple[object, ...], _Instances] = {}
    for name, cards in instances.items():
        alike = [(width.card, width.model, width.before, width.after) for width in cards]
        families.setdefault((family_of(name), *alike), []).extend(cards)
    return list(families.values())


def _rows(paper: Paper, instances: _Instances, scale: Scale) -> list[list[str]]:
    """Return the rows of an instance: cards that differ alike share one."""
    alike: dict[tuple[str, float | None, float | None], list[str]] = {}
    for width in instances:
        key = (width.model, width.before, width.after)
        alike.setdefault(key, []).append(width.card)
    names = list(dict.fromkeys(width.instance for width in instances))
    many = f"{paper.times}{len(names)}" if len(names) > 1 else ""
    return [
        [
            *(["", ""] if row else [family_name(names) or "(top)", many]),
            " ".join(dict.fromkeys(cards)),
            model,
            "-" if before is None else scale.number(before),
            "-" if after is None else scale.number(after),
            factor(paper, before, after) if before and after else "",
        ]
        for row, ((model, before, after), cards) in enumerate(alike.items())
    ]
