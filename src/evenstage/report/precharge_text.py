"""Precharge as text: apart from the paths, counted from its clock."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.families import family_name, family_of
from evenstage.report.scale import Scale
from evenstage.report.table import Column, first_that_fits
from evenstage.report.words import RISING, counted, listed, punctuality
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.paper import Paper
    from evenstage.timing.results import Precharge

_SHOWN: Final = 10
_DEVICES_SHOWN: Final = 3

TITLE: Final = "Precharge, apart from the paths"
NOTE: Final = (
    "counted from the clock's edge to half the supply, and to the end of the ramp; against the "
    "phase, where [[clock]] of the brief gives one."
)


def precharge_lines(paper: Paper, found: Sequence[Precharge]) -> list[str]:
    """Return the dynamic nodes, latest first; those that differ in names only share a line."""
    if not found:
        return []
    rows = precharge_rows(paper, found)
    shown = rows if len(rows) == _SHOWN + 1 else rows[:_SHOWN]
    scale = precharge_scale(found)
    columns = [
        Column("node", kind="name"),
        Column(""),
        Column(f"half, {scale.unit}", align="right"),
        Column("whole", align="right"),
        Column("by", kind="name"),
        Column("after", kind="name"),
        *([Column("phase", kind="name")] if any(row[-1] for _, row in shown) else []),
    ]
    texts = [row[: len(columns)] for _, row in shown]
    _, table = first_that_fits(paper, [(columns, texts)], indent=2)
    lines = table.lines(texts)
    left = len(found) - sum(number for number, _ in shown)
    if left:
        lines.append(f"  and {counted(left, 'node')} more")
    return [*lines, "", *paper.paragraph(NOTE, indent=2)]


def precharge_scale(found: Sequence[Precharge]) -> Scale:
    """Return what all times are written in."""
    return Scale.of((time for one in found for time in (one.delay, one.complete)), "s")


def precharge_rows(paper: Paper, found: Sequence[Precharge]) -> list[tuple[int, list[str]]]:
    """Return how many nodes each row is about, and its cells."""
    scale = precharge_scale(found)
    groups: dict[tuple[str, ...], list[Precharge]] = {}
    for one in found:
        figures = (
            paper.edge(one.edge),
            scale.number(one.delay),
            scale.number(one.complete),
            family_of(", ".join(one.devices)),
            f"{one.clock} {RISING[one.clock_edge]}",
            _against_phase(one),
        )
        groups.setdefault((family_of(one.net), *figures), []).append(one)
    return [(len(group), _row(paper, group, figures)) for (_, *figures), group in groups.items()]


def _row(paper: Paper, group: Sequence[Precharge], figures: Sequence[str]) -> list[str]:
    many = f"{len(group)} {paper.times} " if len(group) > 1 else ""
    first = group[0].devices
    names = family_name([", ".join(one.devices) for one in group])
    by = names if len(first) <= _DEVICES_SHOWN else listed(first, _DEVICES_SHOWN)
    return [many + family_name([one.net for one in group]), *figures[:3], by, *figures[4:]]


def _against_phase(one: Precharge) -> str:
    """Return how a precharge keeps to the phase of its clock, where that is known."""
    if one.phase is None:
        return ""
    return f"{punctuality(one.complete, one.phase)} of {engineering(one.phase, 's')}"
