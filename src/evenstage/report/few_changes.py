"""Delay against the number of changed cards."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.scale import Scale, percent, plain
from evenstage.report.table import Column, lay_out
from evenstage.report.words import counted

if TYPE_CHECKING:
    from evenstage.report.paper import Paper
    from evenstage.sizing.results import FewChanges, FewChangesPoint

#: Rows at most; between them the JSON knows more.
_ROWS: Final = 14

_COLUMNS: Final = (
    Column("cards", align="right"),
    Column("charged", align="right"),
    Column("to today", align="right"),
    Column("of all gain", align="right"),
    Column("", kind="chart", least=12, most=40),
)


def few_changes_section(paper: Paper, few: FewChanges) -> tuple[str, list[str]]:
    """Return title and lines: a row for each number of cards, its part of the gain as a bar."""
    today, title = few.today_charged_delay, "Delay against the number of changes"
    shown = _shown(few)
    time = Scale.of([today, *(point.charged_delay for point in shown)], "s")
    gain = max(today - few.bound, 0.0) or 1.0
    shares = [max(today - point.charged_delay, 0.0) / gain for point in shown]
    rows = [
        [
            str(point.cards),
            time.number(point.charged_delay),
            percent(today, point.charged_delay),
            f"{plain(100 * share, 0)} %",
            "",
        ]
        for point, share in zip(shown, shares, strict=True)
    ]
    table = lay_out(paper, _COLUMNS, rows, indent=2)
    sign = "\N{FULL BLOCK}" if paper.unicode else "="
    bars = [sign * round(share * table.widths[-1]) for share in shares]
    every = (
        f" Every set of up to {counted(few.asked, 'card')} was tried."
        if few.every_set_tried
        else ""
    )
    text = (
        f"Today: {time.text(today)}. Each row is the best set of so many cards that was found, its "
        f"sizes proved for that set, off the grid.{every} However many cards change, no sizes "
        f"within the limits go below {time.text(few.bound)}."
    )
    lines = paper.paragraph(text, indent=2)
    if not rows:
        return title, lines
    head = [table.titles(), table.line("", time.unit, "", "", "")]
    body = [table.line(*row[:-1], bar) for row, bar in zip(rows, bars, strict=True)]
    return title, [*head, *body, "", *lines]


def _shown(few: FewChanges) -> list[FewChangesPoint]:
    """Return the points to print: that asked for, and others about evenly in their logarithm."""
    points = few.points
    if len(points) <= _ROWS:
        return list(points)
    most = points[-1].cards
    wanted = {round(most ** (step / (_ROWS - 2))) for step in range(_ROWS - 1)} | {few.asked}
    places = {max((i for i, p in enumerate(points) if p.cards <= w), default=0) for w in wanted}
    return [points[place] for place in sorted(places)]
