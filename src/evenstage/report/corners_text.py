"""Results over several processes as text: which corner limits, and by how much."""

from __future__ import annotations

from itertools import islice
from typing import TYPE_CHECKING, Final

from evenstage.report.analysis_text import circumstances, path_section
from evenstage.report.block_text import block_lines
from evenstage.report.difference_text import difference_report
from evenstage.report.families import family_name, family_of
from evenstage.report.frame import framed
from evenstage.report.paper import PLAIN, Paper
from evenstage.report.path_text import legend
from evenstage.report.scale import Scale, percent
from evenstage.report.table import Column, first_that_fits
from evenstage.report.words import block_name, counted, moves, rank, route, section, takes
from evenstage.units import engineering

if TYPE_CHECKING:
    from evenstage.timing.corners import CornerEnd, Corners, CornersDifference
    from evenstage.timing.results import Analysis

_ENDS_SHOWN: Final = 10


def corners_report(corners: Corners, paper: Paper = PLAIN) -> str:
    """Return a block in several processes as text."""
    worst = corners.worst
    lines = section("Corners", _corner_lines(paper, corners))
    for number, path in enumerate(corners.paths, 1):
        where = f" in {path.corner}"
        lines += path_section(paper, corners.corner_of(path), number, path, where)
    lines += ["", *legend(paper, worst.yardstick)]
    title = f"Path ends in their worst corner, {rank(worst)} first"
    lines += section(title, _end_lines(paper, corners))
    lines += section(f"The block in {worst.yardstick.process}", block_lines(paper, worst))
    subject = paper.paragraph(block_name(worst))
    return framed(paper, subject, corners_answer(corners), lines, corners.notices)


def corners_difference_report(difference: CornersDifference, paper: Paper = PLAIN) -> str:
    """Return two netlists in several processes as text."""
    answer = corners_difference_answer(difference)
    lines = [*paper.paragraph(answer), *section("Corners", _moved_lines(paper, difference)), ""]
    rest = difference_report(difference.worst, paper)
    return "\n".join(lines) + "\n" + rest


def corners_difference_answer(difference: CornersDifference) -> str:
    """Return how the slowest path over all corners moves."""
    old, new = difference.before, difference.after
    was, now = old.paths[0], new.paths[0]
    return (
        f"Over {counted(len(new.analyses), 'corner')} the {rank(new.worst)} path "
        f"{moves(was.delay, now.delay)}; it was in {was.corner} and is in {now.corner}, "
        "where the netlists compare as follows."
    )


def corners_answer(corners: Corners) -> str:
    """Return the one thing to know first."""
    slowest, worst = corners.paths[0], corners.worst
    answer = (
        f"The {rank(worst)} path over {counted(len(corners.analyses), 'corner')}, "
        f"{route(slowest)} in {slowest.corner}, {takes(slowest, worst.yardstick)}."
    )
    return " ".join([answer, *circumstances(slowest)])


def _latest(analysis: Analysis) -> float:
    return max((end.delay for end in analysis.ends), default=0.0)


def _corner_lines(paper: Paper, corners: Corners) -> list[str]:
    """Return one line per corner: latest arrival, against the first corner, and its yardstick."""
    delays = [_latest(one) for one in corners.analyses]
    scale = Scale.of(delays, "s")
    rows = [
        [
            one.yardstick.process,
            scale.text(delay),
            percent(delays[0], delay) if number else "",
            engineering(one.yardstick.tau, "s"),
            engineering(one.yardstick.fo4, "s"),
            str(sum(end.corner == one.yardstick.process for end in corners.ends)),
        ]
        for number, (one, delay) in enumerate(zip(corners.analyses, delays, strict=True))
    ]
    columns = [
        Column("", kind="name"),
        Column("worst delay", align="right"),
        Column("", align="right"),
        Column("tau", align="right"),
        Column("FO4", align="right"),
        Column("worst for ends", align="right"),
    ]
    _, table = first_that_fits(paper, [(columns, rows)], indent=2)
    return table.lines(rows)


def _end_lines(paper: Paper, corners: Corners) -> list[str]:
    """Return the path ends, latest first; ends that differ in numbers only share a line."""
    scale = Scale.of((found.end.delay for found in corners.ends), "s")
    groups: dict[tuple[str, ...], list[CornerEnd]] = {}
    for found in corners.ends:
        figures: tuple[str, ...] = (found.end.edge, scale.text(found.end.delay), found.corner)
        figures = (*figures, _by(corners, found))
        groups.setdefault((family_of(found.end.net), *figures), []).append(found)
    shown = dict(islice(groups.items(), _ENDS_SHOWN))
    rows = []
    for key, group in shown.items():
        many = f"{len(group)} {paper.times} " if len(group) > 1 else ""
        rows.append([many + family_name([found.end.net for found in group]), *key[1:]])
    columns = [
        Column("", kind="name"),
        Column(""),
        Column("", align="right"),
        Column("", kind="name"),
        Column("", kind="name"),
    ]
    _, table = first_that_fits(paper, [(columns, rows)], indent=2)
    texts = [table.line(*row) for row in rows]
    left = len(corners.ends) - sum(map(len, shown.values()))
    if left:
        least = scale.text(min(found.end.delay for found in corners.ends))
        texts.append(f"  and {left} more, down to {least}")
    return texts


def _by(corners: Corners, found: CornerEnd) -> str:
    """Return by how much the worst corner is later than each other."""
    others = [
        f"{percent(delay, found.end.delay)} on {name}"
        for name, delay in zip(corners.names, found.delays, strict=True)
        if delay is not None and name != found.corner
    ]
    return ", ".join(others)


def _moved_lines(paper: Paper, difference: CornersDifference) -> list[str]:
    pairs = [(_latest(one.before), _latest(one.after)) for one in difference.differences]
    scale = Scale.of((delay for pair in pairs for delay in pair), "s")
    names = difference.after.names
    rows = [
        [name, scale.text(was), scale.text(now), percent(was, now)]
        for name, (was, now) in zip(names, pairs, strict=True)
    ]
    columns = [
        Column("", kind="name"),
        Column("before", align="right"),
        Column("after", align="right"),
        Column("change", align="right"),
    ]
    _, table = first_that_fits(paper, [(columns, rows)], indent=2)
    return table.lines(rows)
