"""Spend against delay."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.scale import Scale, percent, plain
from evenstage.report.table import Column, first_that_fits

if TYPE_CHECKING:
    from evenstage.report.paper import Paper
    from evenstage.sizing.results import TradeOff

_UNIT: Final = {"width": "m", "energy": "F"}
_SPENT: Final = {"width": "total width", "energy": "switched cap."}

#: Cells of the longest bar, of a narrow paper and at most.
_BAR: Final = (12, 40)


def trade_off_section(paper: Paper, curve: TradeOff) -> tuple[str, list[str]]:
    """Return title and lines: a row for each point, its spend also as a bar."""
    today = (curve.today_charged_delay, curve.today_spend)
    delays = [today[0], *(point.charged_delay for point in curve.points)]
    delays += [point.delay for point in curve.points]
    time = Scale.of(delays, "s")
    spends = [today[1], *(point.spend for point in curve.points)]
    spend = Scale.of(spends, _UNIT[curve.spend])
    buys = Scale.of((point.one_percent_buys or 0.0 for point in curve.points), "s", digits=3)
    rows = [
        [
            time.number(point.charged_delay),
            time.number(point.delay),
            spend.number(point.spend),
            percent(today[1], point.spend),
            "-" if point.one_percent_buys is None else buys.number(point.one_percent_buys),
            "knee" if index == curve.knee else "",
        ]
        for index, point in enumerate(curve.points)
    ]
    columns = (
        Column("charged", align="right"),
        Column("delay", align="right"),
        Column(_SPENT[curve.spend], align="right"),
        Column("to today", align="right"),
        Column("1 % buys", align="right"),
        Column(""),
        Column("", kind="chart", least=_BAR[0], most=_BAR[1]),
    )
    wide = [[*row, ""] for row in rows]
    _, table = first_that_fits(paper, [(columns, wide)], indent=2)
    most = max(spends)
    bars = [_bar(paper, point.spend / most, table.widths[-1]) for point in curve.points]
    units = (time.unit, time.unit, spend.unit, "", buys.unit, "", "")
    title = f"{curve.spend.capitalize()} against delay"
    worst = max(0.001, *(100 * point.gap for point in curve.points))
    text = (
        f"Today: {time.text(today[0])} charged, {spend.text(today[1])}. Each row is the least "
        f"{curve.spend} for its charged delay, off the grid, within {plain(worst, 3)} % of what is "
        f"proved; 1 % buys: less charged delay for 1 % more {curve.spend}, at that point."
    )
    lines = [
        table.titles(),
        table.line(*units),
        *(table.line(*row, bar) for row, bar in zip(rows, bars, strict=True)),
        "",
        *paper.paragraph(text, indent=2),
    ]
    return title, lines


def _bar(paper: Paper, share: float, width: int) -> str:
    sign = "\N{FULL BLOCK}" if paper.unicode else "="
    return sign * max(round(share * width), 1)
