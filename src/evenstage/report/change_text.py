"""Widths that change, as tables."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.families import family_name, family_of
from evenstage.report.scale import Scale, plain
from evenstage.report.table import Column, first_that_fits
from evenstage.report.words import counted

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.paper import Paper
    from evenstage.sizing.results import Change
    from evenstage.timing.results import WidthDifference

_SHOWN: Final = 40

_CHANGE_COLUMNS: Final = (
    Column("gate", kind="name"),
    Column("", align="left", before=1),
    Column("card", kind="name"),
    Column("sets", kind="name"),
    Column("old", align="right"),
    Column("new", align="right"),
    Column("factor", align="right"),
    Column("alone", align="right"),
    Column("written in", kind="name"),
    Column("why"),
)
_PLACE, _WHY = 8, 9


def change_lines(paper: Paper, changes: Sequence[Change]) -> list[str]:
    """Return the changes in the order of the text; of very many those that buy most."""
    if not changes:
        return []
    kept = _largest(changes)
    width = Scale.of((value for c in kept for value in (c.old, c.new)), "m")
    alone = Scale.of((change.alone for change in kept), "s", digits=3)
    rows = [_change_row(paper, change, width, alone) for change in kept]
    for previous, change, row in zip(kept, kept[1:], rows[1:], strict=False):
        if change.instance == previous.instance:
            row[0] = row[1] = row[7] = ""
    units = ["", "", "", "", width.unit, width.unit, "", alone.unit, "", ""]
    everything = range(len(_CHANGE_COLUMNS))
    choices = [everything, everything[:_WHY], everything[:_PLACE]]
    options = [
        ([_CHANGE_COLUMNS[i] for i in c], [[r[i] for i in c] for r in rows]) for c in choices
    ]
    index, table = first_that_fits(paper, options, indent=2)
    lines = [table.titles(), table.line(*(units[i] for i in choices[index]))]
    lines += [table.line(*row) for row in options[index][1]]
    if len(kept) < len(changes):
        lines.append(
            f"  and {len(changes) - len(kept)} more that buy less, all of them in the JSON"
        )
    return lines


def _largest(changes: Sequence[Change]) -> list[Change]:
    """Return the changes that buy most, in their old order."""
    order = sorted(range(len(changes)), key=lambda i: (-abs(changes[i].alone), i))
    return [changes[i] for i in sorted(order[:_SHOWN])]


def _change_row(paper: Paper, change: Change, width: Scale, alone: Scale) -> list[str]:
    many = f"{paper.times}{change.occurrences}" if change.occurrences > 1 else ""
    return [
        change.instance,
        many,
        change.card,
        change.parameter,
        width.number(change.old),
        width.number(change.new),
        factor(paper, change.old, change.new),
        signed(alone.number(change.alone)),
        f"{change.file}:{change.line}",
        change.why,
    ]


def signed(number: str) -> str:
    """Return a number with its sign, zero without."""
    return number if number.startswith("-") or float(number) == 0 else f"+{number}"


def factor(paper: Paper, old: float, new: float) -> str:
    """Return how many times as wide, as in ``×2.07``."""
    ratio = new / old
    return paper.times + plain(ratio, 2 if ratio < 99.995 else 0)


def card_count(changes: Sequence[Change]) -> str:
    """Return how many cards the changes concern."""
    return counted(len({(change.file, change.line, change.card) for change in changes}), "card")


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
