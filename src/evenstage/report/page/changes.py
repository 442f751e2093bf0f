"""Tables of widths that change, or that differ between two netlists."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.change_text import (
    alike_changes,
    change_words,
    factor,
    none_helps_alone,
    one_file,
    place,
    signed,
)
from evenstage.report.families import family_name
from evenstage.report.page.parts import Cell, Heading, Table
from evenstage.report.paper import Paper
from evenstage.report.scale import Scale
from evenstage.report.width_text import alike_differences

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.sizing.results import Change
    from evenstage.timing.results import WidthDifference

#: Groups of gates that are shown.
_GROUPS: Final = 150
_PAPER: Final = Paper(unicode=True)


def change_table(changes: Sequence[Change]) -> Table | None:
    """Return the changes, those that buy most first; gates that change alike share a row."""
    if not changes:
        return None
    together = none_helps_alone(changes)
    groups = sorted(
        alike_changes(changes),
        key=lambda group: min(one.last if together else one.alone for one in group),
    )
    shown = groups[:_GROUPS]
    widths = [value for group in shown for one in group for value in (one.old, one.new)]
    width = Scale.of(widths, "m").trimmed(widths)
    effects = [effect for group in shown for one in group for effect in (one.alone, one.last)]
    alone = Scale.of(effects, "s", digits=3)
    only = one_file(changes)
    rows = tuple(row for group in shown for row in _change_rows(group, width, alone, only))
    headings: tuple[Heading, ...] = (
        Heading("gate"),
        Heading("copies", "number"),
        Heading("cards"),
        Heading("sets"),
        Heading(f"old, {width.unit}", "number"),
        Heading(f"new, {width.unit}", "number"),
        Heading("factor", "number"),
        Heading(f"alone, {alone.unit}", "number"),
        Heading(f"last, {alone.unit}", "number"),
        Heading("line", "number") if only else Heading("written in", "name"),
        Heading("why"),
    )
    if not any(one.why for group in shown for one in group):
        headings, rows = headings[:-1], tuple(row[:-1] for row in rows)
    left = len(groups) - len(shown)
    remark = change_words(changes)
    if left:
        remark += f" {left} more groups of gates that buy less are in the JSON."
    return Table(
        "Gates that change, those that buy most first", headings, rows, remark=remark, sortable=True
    )


def _change_rows(
    group: Sequence[Change], width: Scale, alone: Scale, only: str
) -> list[tuple[Cell, ...]]:
    alike: dict[tuple[str, float, float], list[Change]] = {}
    for one in group:
        alike.setdefault((one.parameter, one.old, one.new), []).append(one)
    names = list(dict.fromkeys(one.instance for one in group))
    many = sum({one.instance: one.occurrences for one in group}.values())
    return [
        (
            Cell(_PAPER.shorten(family_name(names) or "(top)", 36)),
            Cell(str(many)),
            Cell(_PAPER.shorten(" ".join(dict.fromkeys(one.card for one in cards)), 28)),
            Cell(parameter),
            Cell(width.number(old), sort=repr(old)),
            Cell(width.number(new), sort=repr(new)),
            Cell(factor(_PAPER, old, new), sort=repr(new / old)),
            *(
                Cell(signed(alone.number(effect)), sort=repr(effect))
                for effect in (cards[0].alone, cards[0].last)
            ),
            _place_cell(cards, only),
            Cell(cards[0].why),
        )
        for (parameter, old, new), cards in alike.items()
    ]


def _place_cell(cards: Sequence[Change], only: str) -> Cell:
    lines = place(cards, "–")
    if only:
        return Cell(lines, sort=lines.partition("–")[0])
    return Cell(f"{_PAPER.shorten(cards[0].file, 32)}:{lines}")


def difference_table(widths: Sequence[WidthDifference]) -> Table | None:
    """Return widths that differ, instances that differ alike in one row."""
    if not widths:
        return None
    groups = alike_differences(widths)
    shown = groups[:_GROUPS]
    known = [w for group in shown for one in group for w in (one.before, one.after) if w]
    scale = Scale.of(known, "m").trimmed(known)
    rows = tuple(row for group in shown for row in _difference_rows(group, scale))
    headings = (
        Heading("instance"),
        Heading("copies", "number"),
        Heading("cards"),
        Heading("model"),
        Heading(f"before, {scale.unit}", "number"),
        Heading(f"after, {scale.unit}", "number"),
        Heading("factor", "number"),
    )
    left = len(groups) - len(shown)
    remark = f"{left} more groups are in the JSON." if left else ""
    return Table("Widths, instance by instance", headings, rows, remark=remark, sortable=True)


def _difference_rows(group: Sequence[WidthDifference], scale: Scale) -> list[tuple[Cell, ...]]:
    alike: dict[tuple[str, float | None, float | None], list[str]] = {}
    for one in group:
        alike.setdefault((one.model, one.before, one.after), []).append(one.card)
    names = list(dict.fromkeys(one.instance for one in group))
    return [
        (
            Cell(_PAPER.shorten(family_name(names) or "(top)", 36)),
            Cell(str(len(names))),
            Cell(_PAPER.shorten(" ".join(dict.fromkeys(cards)), 28)),
            Cell(model),
            _width_cell(before, scale),
            _width_cell(after, scale),
            Cell(factor(_PAPER, before, after), sort=repr(after / before))
            if before and after
            else Cell("only one", sort="0"),
        )
        for (model, before, after), cards in alike.items()
    ]


def _width_cell(value: float | None, scale: Scale) -> Cell:
    return Cell("–", sort="0") if value is None else Cell(scale.number(value), sort=repr(value))
