"""A block sized for several corners: how it does in each, as text."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.scale import Scale, percent, plain
from evenstage.report.table import Column, first_that_fits
from evenstage.timing.corners import lateness

if TYPE_CHECKING:
    from evenstage.report.paper import Paper
    from evenstage.sizing.results import SizedCorners
    from evenstage.timing.corners import Corners

#: The last only where something was optimised.
_TITLES: Final = ("before", "after", "change", "to spare", "limits")

_SPARE: Final = (
    "One set of widths for all corners. To spare: how much earlier than in the latest corner the "
    "latest path end is."
)
_LIMITS: Final = (
    " Limits: which part of what holds the optimum back lies in that corner, from the multipliers."
)


def sized_corner_rows(corners: SizedCorners) -> tuple[list[str], list[list[str]]]:
    """Return titles and, for each corner, its name and figures; times share one unit."""
    before, after = ([one.paths[0] for one in some.analyses] for some in _both(corners))
    latest = max((path.required or 0.0 for path in after), default=0.0)
    late = [lateness(path, latest) for path in after]
    scale = Scale.of((path.delay for path in (*before, *after)), "s")
    shares = corners.shares or [None] * len(after)
    rows = [
        [
            name,
            scale.text(was.delay),
            scale.text(now.delay),
            percent(was.delay, now.delay),
            scale.text(max(late) - own) if own < max(late) else "",
            "" if share is None else f"{plain(100 * share, 0)} %",
        ]
        for name, was, now, own, share in zip(
            corners.after.names, before, after, late, shares, strict=True
        )
    ]
    kept = 1 + len(_TITLES) - (not corners.shares)
    return ["", *_TITLES][:kept], [row[:kept] for row in rows]


def remark(corners: SizedCorners) -> str:
    """Return what the columns mean."""
    return _SPARE + (_LIMITS if corners.shares else "")


def sized_corner_lines(paper: Paper, corners: SizedCorners) -> list[str]:
    """Return a line for each corner, and what the columns mean."""
    titles, rows = sized_corner_rows(corners)
    columns = [Column("", kind="name"), *(Column(title, align="right") for title in titles[1:])]
    _, table = first_that_fits(paper, [(columns, rows)], indent=2)
    return [*table.lines(rows), "", *paper.paragraph(remark(corners), indent=2)]


def _both(corners: SizedCorners) -> tuple[Corners, Corners]:
    return corners.before, corners.after
