"""Path ends as dots along a delay axis, with what they are required at."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.families import family_name, family_of
from evenstage.report.page.axis import Axis
from evenstage.report.page.element import element, picture, share, text
from evenstage.report.page.parts import Cell, Figure, Heading, Table
from evenstage.report.page.stage_tables import key
from evenstage.report.paper import Paper
from evenstage.report.scale import Scale
from evenstage.report.words import counted, punctuality
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.page.element import Element
    from evenstage.report.page.parts import Part
    from evenstage.timing.results import Analysis, PathEnd

#: Columns of dots, and the most dots in one of them.
_BINS: Final = 90
_HIGHEST: Final = 12
_STEP: Final = 9

#: Rows of the table.
_ROWS: Final = 40


def end_parts(
    analyses: Sequence[tuple[str, Analysis]], goal: float | None = None
) -> tuple[Part, ...]:
    """Return the dots of one or two analyses, and a table of the slowest ends.

    Parameters
    ----------
    analyses : sequence of (str, Analysis)
        Each with its name: nothing, or before and after.
    goal : float, optional
        s, asked for.
    """
    analyses = [(name, analysis) for name, analysis in analyses if analysis.ends]
    ends = [end for _, analysis in analyses for end in analysis.ends]
    if not ends:
        return ()
    required = sorted({end.required for end in ends if end.required is not None})
    goals = [goal] if goal is not None else required if len(required) <= 3 else required[-1:]
    latest = max([*(end.delay for end in ends), *goals])
    earliest = min(end.delay for end in ends)
    first = 0.0 if earliest > 0 else earliest
    axis = Axis(first, max(latest * 1.06, first + 1e-12), "s")
    each = max(
        -(-max(len(bin_) for bin_ in _bins(analysis.ends, axis)) // _HIGHEST)
        for _, analysis in analyses
    )
    strips = tuple(_strip(name, one, axis, goals, each) for name, one in analyses)
    dot = "is one path end" if each == 1 else f"stands for up to {each} path ends"
    caption = f"Each dot {dot}, at the latest arrival."
    caption += " The marked line is when they are required." if goals else " No time is required."
    legend = (key("best", "required at"),) if goals else ()
    return Figure(strips, caption, legend), _end_table(analyses[-1][1])


def _bins(ends: Sequence[PathEnd], axis: Axis) -> list[list[PathEnd]]:
    bins: list[list[PathEnd]] = [[] for _ in range(_BINS)]
    for end in ends:
        bins[min(int(axis.at(end.delay) * _BINS), _BINS - 1)].append(end)
    return bins


def _strip(name: str, analysis: Analysis, axis: Axis, goals: Sequence[float], each: int) -> Element:
    bins = _bins(analysis.ends, axis)
    stacks = [-(-len(bin_) // each) for bin_ in bins]
    base = 26 + _STEP * max(stacks)
    dots = [
        element(
            "circle",
            cx=share((column + 0.5) / _BINS),
            cy=base - 6 - _STEP * row,
            r=3.6,
            class_="dot before" if name == "before" else "dot after",
        )
        for column, count in enumerate(stacks)
        for row in range(count)
    ]
    marks: list[Element] = []
    for value in axis.ticks():
        place = share(axis.at(value))
        marks.append(element("line", x1=place, x2=place, y1=base, y2=base + 5, class_="frame"))
        anchor = "middle" if axis.at(value) > 0.03 else ""
        marks.append(text(place, base + 18, axis.label(value), "tick", anchor))
    marks.append(text("100%", base + 18, axis.scale.unit, "tick", "end"))
    marks.append(element("line", x1=0, x2="100%", y1=base, y2=base, class_="frame"))
    if name:
        marks.append(text(0, 12, name, "strong"))
    for goal in goals:
        place = share(axis.at(goal))
        marks.append(element("line", x1=place, x2=place, y1=4, y2=base, class_="best"))
    late = sum(end.required is not None and end.delay > end.required for end in analysis.ends)
    slowest = max(end.delay for end in analysis.ends)
    label = (
        f"{counted(len(analysis.ends), 'path end')}{f' {name}' if name else ''} along a delay "
        f"axis; the latest arrives at {engineering(slowest, 's')}"
        + (f"; {late} later than required" if goals else "")
    )
    return picture(label, *marks, *dots, class_="strip", height=base + 24)


def _end_table(analysis: Analysis) -> Table:
    """Return the latest ends; those that differ in numbers only share a row."""
    paper = Paper(unicode=True)
    scale = Scale.of((end.delay for end in analysis.ends), "s")
    groups: dict[tuple[object, ...], list[PathEnd]] = {}
    for end in analysis.ends:
        alike = (scale.text(end.delay), end.edge, end.required, end.why)
        groups.setdefault((family_of(end.net), *alike), []).append(end)
    shown = list(groups.values())[:_ROWS]
    headings: tuple[Heading, ...] = (
        Heading("path end"),
        Heading("how many", "number"),
        Heading("edge"),
        Heading(f"arrival, {scale.unit}", "number"),
        Heading("against its goal", "number"),
        Heading("what it is"),
    )
    left = len(analysis.ends) - sum(map(len, shown))
    least = scale.text(min(end.delay for end in analysis.ends))
    remark = f"{left} more, down to {least}, are in the JSON." if left else ""
    rows = tuple(_end_row(group, paper, scale) for group in shown)
    if all(end.required is None for end in analysis.ends):
        headings, rows = (*headings[:4], *headings[5:]), tuple((*r[:4], *r[5:]) for r in rows)
    return Table("The latest path ends", headings, rows, remark=remark, sortable=True)


def _end_row(group: Sequence[PathEnd], paper: Paper, scale: Scale) -> tuple[Cell, ...]:
    end = group[0]
    name = family_name([one.net for one in group])
    late = "" if end.required is None else punctuality(end.delay, end.required)
    return (
        Cell(paper.shorten(name, 44)),
        Cell(str(len(group))),
        Cell(f"{paper.edge(end.edge)} {end.edge}"),
        Cell(scale.number(end.delay), sort=repr(end.delay)),
        Cell(late, sort="" if end.required is None else repr(end.delay - end.required)),
        Cell(end.why),
    )
