"""Two paths or two blocks side by side: before and after."""

from __future__ import annotations

from dataclasses import dataclass
from difflib import SequenceMatcher
from typing import TYPE_CHECKING, Final, Literal

from evenstage.report.bars import TimeAxis
from evenstage.report.families import family_name, family_of
from evenstage.report.scale import Scale, percent
from evenstage.report.table import Column, Table, first_that_fits
from evenstage.report.words import switching

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.report.paper import Paper
    from evenstage.timing.results import Analysis, Path, Stage

_OUTPUT, _TIME, _DELAY, _WIDTH, _HOLD = 2, 5, 6, 8, 9
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


@dataclass(frozen=True, slots=True)
class _Line:
    """One stage of one of the two paths; ``number`` counts pairs, ``above`` is the other stage."""

    number: int
    above: Stage | None
    when: Literal["before", "after"]
    stage: Stage
    span: tuple[float, float]


def paired(before: Sequence[Stage], after: Sequence[Stage]) -> list[tuple[int | None, int | None]]:
    """Return the indices of stages in pairs, in the order of both paths.

    A pair is one instance in both paths; where they share none, gates of one kind. None stands
    where only the other path has the stage.
    """
    shared = {stage.instance for stage in before} & {stage.instance for stage in after}
    key = _instance if shared else _kind
    matcher = SequenceMatcher(None, [*map(key, before)], [*map(key, after)], autojunk=False)
    pairs: list[tuple[int | None, int | None]] = []
    for tag, i, i_end, j, j_end in matcher.get_opcodes():
        if tag == "equal":
            pairs += zip(range(i, i_end), range(j, j_end), strict=True)
        else:
            pairs += [(index, None) for index in range(i, i_end)]
            pairs += [(None, index) for index in range(j, j_end)]
    return pairs


def _instance(stage: Stage) -> tuple[str, ...]:
    return (stage.instance,)


def _kind(stage: Stage) -> tuple[str, ...]:
    return stage.subcircuit, stage.function


def pair_lines(
    paper: Paper, before: Path, after: Path, *, holds: Mapping[str, str] | None = None
) -> list[str]:
    """Return two paths stage by stage on one time axis, before above after, and a legend.

    Parameters
    ----------
    paper : Paper
    before, after : Path
    holds : mapping of str to str, optional
        What holds each instance of ``after`` at its size.
    """
    lines = _interleaved(before, after)
    if not lines:
        return []
    stages = [line.stage for line in lines]
    time = Scale.of((stage.delay for stage in stages), "s", digits=3, least=1)
    effort = Scale.of((stage.stage_effort for stage in stages), digits=2, least=1)
    width = Scale.of((stage.width for stage in stages), "m", digits=3)
    rows = [_row(paper, line, holds or {}, (time, effort, width)) for line in lines]
    kept, table = _table(paper, rows, held=bool(holds))
    start, end = min(before.start_arrival, after.start_arrival), max(before.delay, after.delay)
    axis = TimeAxis(start, end, table.widths[kept.index(_TIME)], time, paper)
    for row, line in zip(rows, lines, strict=True):
        row[_TIME] = axis.bar(*line.span, thin=line.when == "before")
    head = _head(axis, width)
    drawn = [table.line(*(row[i] for i in kept)) for row in (*head, *rows)]
    return [*drawn, "", *paper.paragraph(_legend(before, kept), indent=2)]


def _legend(path: Path, kept: Sequence[int]) -> str:
    """Return what the columns mean."""
    parts = [f"f stage effort, best {path.best_stage_effort:.2f}"]
    if _WIDTH in kept:
        parts.append("width of all transistors of the gate")
    if _HOLD in kept:
        parts.append("held by the limit that keeps the new size from moving")
    return "; ".join(parts) + "."


def _table(
    paper: Paper, rows: Sequence[Sequence[str]], *, held: bool
) -> tuple[Sequence[int], Table]:
    """Return the columns there is room for, by their indices, and their layout."""
    everything = range(len(_COLUMNS) if held else _HOLD)
    less = [i for i in everything if i != _OUTPUT]
    choices = [everything, less, [i for i in less if i != _WIDTH]]
    options = [([_COLUMNS[i] for i in c], [[row[i] for i in c] for row in rows]) for c in choices]
    index, table = first_that_fits(paper, options)
    return choices[index], table


def _interleaved(before: Path, after: Path) -> list[_Line]:
    """Return the stages of both paths in the order in which they are printed."""
    old, new = switching(before), switching(after)
    lines: list[_Line] = []
    for number, (i, j) in enumerate(paired(before.stages, after.stages), 1):
        if i is not None:
            lines.append(_Line(number, None, "before", before.stages[i], old[i]))
        if j is not None:
            above = None if i is None else before.stages[i]
            lines.append(_Line(number, above, "after", after.stages[j], new[j]))
    return lines


def _row(
    paper: Paper, line: _Line, holds: Mapping[str, str], scales: tuple[Scale, Scale, Scale]
) -> list[str]:
    """Return the texts of all columns, the time column still empty."""
    stage = line.stage
    time, effort, width = scales
    return [
        *_names(paper, line),
        line.when,
        "",
        time.number(stage.delay),
        effort.number(stage.stage_effort),
        width.number(stage.width),
        holds.get(stage.instance, "") if line.when == "after" else "",
    ]


def _names(paper: Paper, line: _Line) -> list[str]:
    """Return number, gate, output and edge, without what the line above says already."""
    stage, above = line.stage, line.above
    names = [stage.instance, stage.output, paper.edge(stage.edge)]
    if above is None:
        return [str(line.number), *names]
    said = [above.instance, above.output, paper.edge(above.edge)]
    return ["", *("" if name == other else name for name, other in zip(names, said, strict=True))]


def _head(axis: TimeAxis, width: Scale) -> list[list[str]]:
    """Return the titles with the tick labels, and the units with the axis."""
    titles = [column.title for column in _COLUMNS]
    titles[_TIME] = axis.labels()
    units = [""] * len(_COLUMNS)
    units[_TIME], units[_DELAY], units[_WIDTH] = axis.ruler(), axis.scale.unit, width.unit
    return [titles, units]


def total_lines(paper: Paper, before: Analysis, after: Analysis) -> list[str]:
    """Return what two blocks differ in as wholes, and which inputs have changed."""
    rows = total_rows(paper, before, after)
    columns = [
        Column("", kind="name"),
        Column("before", align="right"),
        Column("after", align="right"),
        Column("change", align="right"),
    ]
    _, table = first_that_fits(paper, [(columns, rows)], indent=2)
    return table.lines(rows)


def total_rows(paper: Paper, before: Analysis, after: Analysis) -> list[list[str]]:
    """Return a row for each total and each changed input: name, before, after, change."""
    rows = [
        _total("worst delay", "s", _worst(before), _worst(after)),
        _total("worst charged delay", "s", worst_charged(before), worst_charged(after)),
        _total("worst transition", "s", before.worst_transition, after.worst_transition),
        _total("total width", "m", before.total_width, after.total_width),
        _total("switched capacitance", "F", before.switched_cap, after.switched_cap),
        _total("input capacitance, all", "F", _inputs(before), _inputs(after)),
    ]
    old, new = dict(before.input_caps), dict(after.input_caps)
    changed: dict[tuple[str, float, float], list[str]] = {}
    for net, cap in old.items():
        if new.get(net, cap) != cap:
            changed.setdefault((family_of(net), cap, new[net]), []).append(net)
    for (_, was, now), nets in changed.items():
        many = f"{len(nets)} {paper.times} " if len(nets) > 1 else ""
        rows.append(_total(f"input {many}{family_name(nets)}", "F", was, now))
    return rows


def worst_charged(analysis: Analysis) -> float:
    """Return the largest charged delay of a block's path ends and paths, s."""
    delays = [end.charged_delay for end in analysis.ends]
    return max([*delays, *(path.charged_delay for path in analysis.paths)], default=0.0)


def _worst(analysis: Analysis) -> float:
    delays = [end.delay for end in analysis.ends]
    return max([*delays, *(path.delay for path in analysis.paths)], default=0.0)


def _inputs(analysis: Analysis) -> float:
    return sum(cap for _, cap in analysis.input_caps)


def _total(label: str, unit: str, before: float, after: float) -> list[str]:
    scale = Scale.of([before, after], unit)
    return [label, scale.text(before), scale.text(after), percent(before, after)]
