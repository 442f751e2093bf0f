"""A sizing as text: what the new widths buy, how good they are, and what changes where."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.analysis_text import required
from evenstage.report.block_text import block_lines
from evenstage.report.change_text import card_count, change_lines, change_words
from evenstage.report.few_changes import few_changes_section
from evenstage.report.frame import framed
from evenstage.report.pair_text import pair_lines, total_lines
from evenstage.report.paper import PLAIN, Paper
from evenstage.report.path_text import path_lines
from evenstage.report.prices import price_lines
from evenstage.report.quality_text import quality_lines
from evenstage.report.scale import percent
from evenstage.report.sized_corners import sized_corner_lines
from evenstage.report.trade_off import trade_off_section
from evenstage.report.words import (
    block_name,
    counted,
    labelled,
    moves,
    rank,
    route,
    same_route,
    section,
)
from evenstage.units import engineering

if TYPE_CHECKING:
    from evenstage.sizing.results import Hold, Sizing

HOLDS: Final[dict[Hold, str]] = {
    "": "",
    "lower": "least width",
    "upper": "greatest width",
    "fixed": "fixed",
    "ceiling": "input ceiling",
    "transition": "transition",
    "same size": "same size",
    "skew": "skew",
}


def sizing_report(sizing: Sizing, paper: Paper = PLAIN) -> str:
    """Return a sizing as text: what it buys, its bound, the changes, the path before and after."""
    before, after = sizing.before, sizing.after
    lines: list[str] = []
    if sizing.corners is not None:
        lines += section("Corners", sized_corner_lines(paper, sizing.corners))
    lines += section("How good the widths are", quality_lines(paper, sizing))
    lines += section("What more room would buy", price_lines(paper, sizing))
    lines += section("Changes", _changes(paper, sizing))
    if sizing.few is not None:
        lines += section(*few_changes_section(paper, sizing.few))
    if sizing.trade_off is not None:
        lines += section(*trade_off_section(paper, sizing.trade_off))
    lines += _stages(paper, sizing)
    block = total_lines(paper, before, after) if sizing.changes else block_lines(paper, before)
    lines += section(f"The block{_where(sizing)}", block)
    subject = paper.paragraph(block_name(before))
    notices = (*sizing.notices, *sizing.block_notices)
    return framed(paper, subject, sizing_answer(sizing), lines, notices)


def sizing_answer(sizing: Sizing) -> str:
    """Return what to know first."""
    before, after = sizing.before, sizing.after
    old, new = sizing.slowest_before, after.paths[0]
    if not sizing.changes:
        stays = f"The {rank(before)} path, {route(old)}, stays at {engineering(old.delay, 's')}"
        return f"Nothing changes: {_why_nothing(sizing)}. {stays}{_where(sizing)}."
    verb = "changes" if card_count(sizing.changes) == "1 card" else "change"
    width = percent(sizing.total_width_before, sizing.total_width_after)
    now = "The same path is" if same_route(old, new) else "Another path is now"
    over = ""
    if sizing.corners is not None:
        over = f" over {counted(len(sizing.every_after), 'corner')}"
        now = now if new.corner == old.corner else f"It was in {old.corner}. {now}"
    return (
        f"The {rank(before)} path{over} {moves(old.delay, new.delay)}; "
        f"{card_count(sizing.changes)} {verb}; total width {width}. {now} the {rank(after)}: "
        f"{route(new)}{_where(sizing)}."
        f"{''.join(f' {sentence}' for sentence in required(new))}"
    )


def _where(sizing: Sizing) -> str:
    """Return the corner that limits, where there are several."""
    return "" if sizing.corners is None else f" in {sizing.after.yardstick.process}"


def _why_nothing(sizing: Sizing) -> str:
    if sizing.already_done:
        return "this netlist was written with the same wishes before"
    if sizing.free_cards == 0:
        return f"none of the {counted(sizing.fixed_cards, 'card')} may change"
    return f"no widths on the grid and within the limits serve the goal ({sizing.goal}) better"


def _changes(paper: Paper, sizing: Sizing) -> list[str]:
    lines = change_lines(paper, sizing.changes)
    if not lines:
        return []
    return [*lines, "", *paper.paragraph(change_words(sizing.changes), indent=2)]


def _stages(paper: Paper, sizing: Sizing) -> list[str]:
    """Return the slowest paths before and after, or the one path where nothing changes."""
    old, new = sizing.before.paths[0], sizing.after.paths[0]
    path = f"The {rank(sizing.before)} path{_where(sizing)}"
    holds = {hold.instance: HOLDS[hold.hold] for hold in sizing.holds if hold.hold}
    if not sizing.changes:
        lines = path_lines(paper, new, branches=True)
        if holds:
            held = ", ".join(f"{instance} ({hold})" for instance, hold in holds.items())
            lines += ["", *labelled(paper, "held", held)]
        return section(path, lines)
    title = f"{path} before and after"
    if not same_route(old, new):
        title = f"{path} before and the one after, stages of one gate together"
    return section(title, pair_lines(paper, old, new, holds=holds))
