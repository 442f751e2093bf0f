"""Two netlists of one design side by side, as text."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.families import gathered
from evenstage.report.frame import framed
from evenstage.report.pair_text import pair_lines, total_lines
from evenstage.report.paper import PLAIN, Paper
from evenstage.report.width_text import difference_lines
from evenstage.report.words import (
    both_names,
    counted,
    labelled,
    listed,
    moves,
    rank,
    route,
    same_route,
    section,
)

if TYPE_CHECKING:
    from evenstage.timing.results import Difference, Path

_NAMES_SHOWN: Final = 12


def difference_report(difference: Difference, paper: Paper = PLAIN) -> str:
    """Return a comparison as text: slowest paths, blocks, widths, and what only one netlist has."""
    before, after = difference.before, difference.after
    lines = _paths(paper, difference)
    lines += section("The blocks", total_lines(paper, before, after))
    lines += section("Widths that differ", difference_lines(paper, difference.widths))
    lines += section("In only one netlist", _only_lines(paper, difference))
    subject = both_names(paper, before, after)
    notices = (*before.notices, *after.notices)
    return framed(paper, subject, difference_answer(difference), lines, notices)


def difference_answer(difference: Difference) -> str:
    """Return the one thing to know first."""
    old, new = difference.before.paths[0], difference.after.paths[0]
    both = sum(w.before is not None and w.after is not None for w in difference.widths)
    slowest = f"{rank(difference.before)} path {moves(old.delay, new.delay)}"
    if same_route(old, new):
        which = f"It is the same in both: {route(old)}."
    else:
        which = f"Before it is {route(old)}; after, {route(new)}."
    single = len(difference.widths) - both
    return f"The {slowest}. {which} {_agreement(both, difference.unchanged, single)}"


def _agreement(differing: int, same: int, single: int) -> str:
    """Return how many transistors differ, agree, and stand in one netlist only."""
    if not differing and not same:
        return "No transistor stands in both netlists: are they of one design?"
    only = f"; {counted(single, 'transistor')} in only one netlist" if single else ""
    return f"Widths differ on {counted(differing, 'transistor')} and agree on {same}{only}."


def _paths(paper: Paper, difference: Difference) -> list[str]:
    """Return the slowest path of each netlist beside the same path of the other."""
    old, new = difference.before.paths[0], difference.after.paths[0]
    old_after, new_before = difference.same_path_after, difference.same_path_before
    if same_route(old, new):
        return _pair(paper, f"The {rank(difference.before)} path", old, new)
    if old_after is None and new_before is None:
        title = f"The {rank(difference.before)} path of each, stages of one gate together"
        return _pair(paper, title, old, new)
    lines = []
    if old_after is not None:
        lines += _pair(
            paper, f"The {rank(difference.before)} path before: {route(old)}", old, old_after
        )
    if new_before is not None:
        lines += _pair(
            paper, f"The {rank(difference.after)} path after: {route(new)}", new_before, new
        )
    return lines


def _pair(paper: Paper, title: str, before: Path, after: Path) -> list[str]:
    return ["", *paper.paragraph(title), *pair_lines(paper, before, after)]


def _only_lines(paper: Paper, difference: Difference) -> list[str]:
    lines: list[str] = []
    for label, names in (("before", difference.only_before), ("after", difference.only_after)):
        if names:
            texts = gathered(names, paper.times)
            lines += labelled(paper, label, listed(texts, _NAMES_SHOWN))
    return lines
