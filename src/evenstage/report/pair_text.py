"""Two paths or two blocks side by side: before and after."""

from __future__ import annotations

from difflib import SequenceMatcher
from typing import TYPE_CHECKING, Final

from evenstage.report.bars import TimeAxis
from evenstage.report.scale import Scale, percent
from evenstage.report.table import Column, first_that_fits

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.report.paper import Paper
    from evenstage.timing.results import Analysis, Path, Stage

_GATE, _OUTPUT, _EDGE, _WHEN, _TIME, _DELAY, _F, _WIDTH, _HOLD = range(1, 10)
_COLUMNS: Final = (
    Column("", align="right"),
    Column("gate", kind="name"),
    Column("output", kind="name"),
    Column("", before=1),
    Column(""),
    Column("time", kind="chart", least=16, most=60),
    Column("delay", align="right"),
    Column("f", align="right"),
    Column("width", align="right"),
    Column("held by"),
)


def paired(
    before: Sequence[Stage], after: Sequence[Stage]
) -> list[tuple[Stage | None, Stage | None]]:
    """Return the stages of two paths in pairs of one instance; None where one has no such stage."""
    matcher = SequenceMatcher(
        None, [s.instance for s in before], [s.instance for s in after], autojunk=False
    )
    pairs: list[tuple[Stage | None, Stage | None]] = []
    for tag, i, i_end, j, j_end in matcher.get_opcodes():
        if tag == "equal":
            pairs += zip(before[i:i_end], after[j:j_end], strict=True)
        else:
            pairs += [(stage, None) for stage in before[i:i_end]]
            pairs += [(None, stage) for stage in after[j:j_end]]
    return pairs


def pair_lines(
    paper: Paper, before: Path, after: Path, *, holds: Mapping[str, str] | None = None
) -> list[str]:
    """Return two paths stage by stage on one time axis, before above after.

    Parameters
    ----------
    paper : Paper
    before, after : Path
    holds : mapping of str to str, optional
        What holds each instance of ``after`` at its size.
    """
    stages = [*before.stages, *after.stages]
    if not stages:
        return []
    time = Scale.of([before.delay, after.delay, *(stage.delay for stage in stages)], "s")
    effort = Scale.of((stage.stage_effort for stage in stages), digits=2, least=1)
    width = Scale.of((stage.width for stage in stages), "m", digits=3)
    rows: list[list[str]] = []
    drawn: list[Stage] = []
    for number, pair in enumerate(paired(before.stages, after.stages), 1):
        first = True
        for when, stage in zip(("before", "after"), pair, strict=True):
            if stage is None:
                continue
            names = [str(number), stage.instance, stage.output, paper.edge(stage.edge)]
            figures = [time.number(stage.delay), effort.number(stage.stage_effort)]
            hold = (holds or {}).get(stage.instance, "") if when == "after" else ""
            rows.append(
                [
                    *(names if first else [""] * len(names)),
                    when,
                    "",
                    *figures,
                    width.number(stage.width),
                    hold,
                ]
            )
            drawn.append(stage)
            first = False
    columns = _COLUMNS if holds is not None else _COLUMNS[:_HOLD]
    rows = [row[: len(columns)] for row in rows]
    _, table = first_that_fits(paper, [(columns, rows)])
    start = min(before.start_arrival, after.start_arrival)
    axis = TimeAxis(start, max(before.delay, after.delay), table.widths[_TIME], time, paper)
    for row, stage in zip(rows, drawn, strict=True):
        row[_TIME] = axis.bar(stage.arrival - stage.delay, stage.arrival)
    titles = [column.title for column in columns]
    titles[_TIME] = axis.labels()
    units = [""] * len(columns)
    units[_TIME], units[_DELAY], units[_WIDTH] = axis.ruler(), time.unit, width.unit
    return [table.line(*titles), table.line(*units), *(table.line(*row) for row in rows)]


def total_lines(paper: Paper, before: Analysis, after: Analysis) -> list[str]:
    """Return what two blocks differ in as wholes, and which inputs have changed."""
    rows = [
        _total("worst delay", "s", _worst(before), _worst(after)),
        _total("worst charged delay", "s", worst_charged(before), worst_charged(after)),
        _total("worst transition", "s", before.worst_transition, after.worst_transition),
        _total("total width", "m", before.total_width, after.total_width),
        _total("switched capacitance", "F", before.switched_cap, after.switched_cap),
        _total("input capacitance, all", "F", _inputs(before), _inputs(after)),
    ]
    old, new = dict(before.input_caps), dict(after.input_caps)
    rows += [
        _total(f"input {net}", "F", old[net], new[net])
        for net in old
        if net in new and old[net] != new[net]
    ]
    columns = [
        Column("", kind="name"),
        Column("before", align="right"),
        Column("after", align="right"),
        Column("change", align="right"),
    ]
    _, table = first_that_fits(paper, [(columns, rows)], indent=2)
    return table.lines(rows)


def worst_charged(analysis: Analysis) -> float:
    """Return the largest charged delay of a block's path ends and paths, s."""
    delays = [end.charged_delay for end in analysis.ends]
    return max([*delays, *(path.charged_delay for path in analysis.paths)], default=0.0)


def _worst(analysis: Analysis) -> float:
    return max((path.delay for path in analysis.paths), default=0.0)


def _inputs(analysis: Analysis) -> float:
    return sum(cap for _, cap in analysis.input_caps)


def _total(label: str, unit: str, before: float, after: float) -> list[str]:
    scale = Scale.of([before, after], unit)
    return [label, scale.text(before), scale.text(after), percent(before, after)]
