"""A sizing as text: what the new widths buy, how good they are, and what changes where."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.block_text import block_lines, finished, notice_lines
from evenstage.report.change_text import card_count, change_lines
from evenstage.report.pair_text import pair_lines, total_lines, worst_charged
from evenstage.report.paper import Paper
from evenstage.report.path_text import path_lines
from evenstage.report.scale import Scale, percent, plain
from evenstage.report.words import counted, labelled, moves, route, same_route, section
from evenstage.units import engineering

if TYPE_CHECKING:
    from evenstage.sizing.results import Hold, Sizing

_HOLDS: Final[dict[Hold, str]] = {
    "": "",
    "lower": "least width",
    "upper": "greatest width",
    "fixed": "fixed",
    "ceiling": "input ceiling",
    "transition": "transition",
    "grid": "width grid",
    "same size": "same size",
}


def sizing_report(
    sizing: Sizing, *, width: int = 100, unicode: bool = False, notices: bool = True
) -> str:
    """Return a sizing as text: what it buys, its bound, the changes, the path before and after.

    Parameters
    ----------
    sizing : Sizing
    width : int
        Character cells per line, 80 to 160.
    unicode : bool
        Whether the output can show more than ASCII.
    notices : bool
        Whether the notices are printed too.

    Returns
    -------
    str
        Lines without trailing blanks, the last one ended too.
    """
    paper = Paper(width, unicode)
    before, after = sizing.before, sizing.after
    lines = [*paper.paragraph(f"{before.source}, block {before.top}"), ""]
    lines += paper.paragraph(_answer(sizing))
    lines += section("How good the widths are", _quality_lines(paper, sizing))
    lines += section("Changes", _changes(paper, sizing))
    lines += _stages(paper, sizing)
    block = total_lines(paper, before, after) if sizing.changes else block_lines(paper, before)
    lines += section("The block", block)
    if notices:
        lines += section("Notices", notice_lines(paper, (*sizing.notices, *before.notices)))
    return finished(paper, lines)


def _answer(sizing: Sizing) -> str:
    """Return what to know first."""
    old, new = sizing.before.paths[0], sizing.after.paths[0]
    if not sizing.changes:
        stays = f"The slowest path, {route(old)}, stays at {engineering(old.delay, 's')}."
        return f"Nothing changes: {_why_nothing(sizing)}. {stays}"
    verb = "changes" if card_count(sizing.changes) == "1 card" else "change"
    width = percent(sizing.total_width_before, sizing.total_width_after)
    now = "The same path is" if same_route(old, new) else "Another path is now"
    return (
        f"The slowest path {moves(old.delay, new.delay)}; {card_count(sizing.changes)} {verb}; "
        f"total width {width}. {now} the slowest: {route(new)}."
    )


def _why_nothing(sizing: Sizing) -> str:
    if sizing.already_done:
        return "this netlist was written with the same wishes before"
    if sizing.free_cards == 0:
        return f"none of the {counted(sizing.fixed_cards, 'card')} may change"
    return f"no widths on the grid and within the limits serve the goal ({sizing.goal}) better"


def _quality_lines(paper: Paper, sizing: Sizing) -> list[str]:
    """Return goal, bound and distance to it in words."""
    cards = f" ({counted(sizing.free_cards, 'size')} free to move, {sizing.fixed_cards} fixed)"
    proof = (
        f"the best sizes off the grid are proved to lie within {_gap(sizing.gap)} of the bound; "
        f"putting widths on the grid costs {_loss(sizing.rounding_loss)}"
    )
    return [
        *labelled(paper, "goal", sizing.goal + ("" if sizing.already_done else cards)),
        *labelled(paper, "bound", _bound(sizing)),
        *labelled(paper, "proof", proof),
    ]


def _bound(sizing: Sizing) -> str:
    """Return what no sizes can beat, and where the written ones stand."""
    if sizing.bound_on == "width":
        reached, unit = sizing.total_width_after, "m"
        wish = "be narrower in total than"
        least = f"; the fastest possible would be {engineering(sizing.least_delay, 's')}"
    else:
        reached, unit = worst_charged(sizing.after), "s"
        wish = "have a worst charged delay below"
        least = ""
    scale = Scale.of([sizing.bound, reached], unit)
    above = 100 * (reached - sizing.bound) / sizing.bound
    where = f"{plain(above, 2 if above < 9.995 else 0)} % above" if above >= 0.005 else "just there"
    return (
        f"no sizes within the limits can {wish} {scale.text(sizing.bound)}; the written ones are "
        f"at {scale.text(reached)}, {where}{least}"
    )


def _gap(gap: float) -> str:
    """Return a relative gap; very small ones as an upper limit."""
    return f"{plain(100 * gap, 3)} %" if gap >= 1e-5 else "0.001 %"


def _loss(loss: float) -> str:
    return f"{plain(100 * loss, 2)} %" if loss >= 5e-5 else "nothing"


def _changes(paper: Paper, sizing: Sizing) -> list[str]:
    lines = change_lines(paper, sizing.changes)
    if not lines:
        return []
    text = "alone: change of the worst delay if only that gate changed; drawn widths of one copy."
    return [*lines, "", *paper.paragraph(text, indent=2)]


def _stages(paper: Paper, sizing: Sizing) -> list[str]:
    """Return the slowest paths before and after, or the one path where nothing changes."""
    old, new = sizing.before.paths[0], sizing.after.paths[0]
    holds = {hold.instance: _HOLDS[hold.hold] for hold in sizing.holds if hold.hold}
    if not sizing.changes:
        lines = path_lines(paper, new, branches=True)
        if holds:
            held = ", ".join(f"{instance} ({hold})" for instance, hold in holds.items())
            lines += ["", *labelled(paper, "held", held)]
        return section("The slowest path", lines)
    title = "The slowest path before and after"
    if not same_route(old, new):
        title = "The slowest path before and the one after, stages of one gate together"
    return section(title, pair_lines(paper, old, new, holds=holds))
