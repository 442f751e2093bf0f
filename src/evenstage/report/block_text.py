"""What a report says of the whole block: path ends, sizes, inputs and process."""

from __future__ import annotations

from itertools import islice
from typing import TYPE_CHECKING, Final

from evenstage.report.families import family_name, family_of
from evenstage.report.scale import Scale
from evenstage.report.table import Column, first_that_fits
from evenstage.report.words import counted, labelled, listed, punctuality
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.paper import Paper
    from evenstage.timing.results import Analysis, PathEnd

#: Reasons for a path end that need no telling.
_EXPECTED: Final = {"output", "asked for"}

_ENDS_SHOWN: Final = 10
_INPUTS_SHOWN: Final = 8


def end_lines(paper: Paper, ends: Sequence[PathEnd]) -> list[str]:
    """Return the path ends, slowest first; ends that differ in numbers only share a line."""
    if not ends:
        return []
    scale = Scale.of((end.delay for end in ends), "s")
    lines: dict[tuple[str, ...], list[PathEnd]] = {}
    for end in ends:
        figures = (end.edge, scale.text(end.delay), _end_remark(end))
        lines.setdefault((family_of(end.net), *figures), []).append(end)
    most = len(lines) if len(lines) == _ENDS_SHOWN + 1 else _ENDS_SHOWN
    shown = dict(islice(lines.items(), most))
    rows = [[_together(paper, group), *figures] for (_, *figures), group in shown.items()]
    columns = [
        Column("", kind="name"),
        Column(""),
        Column("", align="right"),
        Column("", kind="name"),
    ]
    _, table = first_that_fits(paper, [(columns, rows)], indent=2)
    texts = [table.line(*row) for row in rows]
    left = len(ends) - sum(len(group) for group in shown.values())
    if left:
        least = scale.text(min(end.delay for end in ends))
        texts.append(f"  and {left} more, down to {least}")
    return texts


def _together(paper: Paper, group: Sequence[PathEnd]) -> str:
    many = f"{len(group)} {paper.times} " if len(group) > 1 else ""
    return many + family_name([end.net for end in group])


def _end_remark(end: PathEnd) -> str:
    """Return when the end is required and what it is, where there is something to say."""
    remarks = []
    if end.required is not None:
        late = punctuality(end.delay, end.required)
        remarks.append(f"{late} (required at {engineering(end.required, 's')})")
    if end.why not in _EXPECTED:
        remarks.append(end.why)
    return ", ".join(remarks)


def block_lines(paper: Paper, analysis: Analysis) -> list[str]:
    """Return the block's size, its inputs and the process it was measured with."""
    counts, yardstick = analysis.counts, analysis.yardstick
    size = (
        f"{counted(counts.devices, 'transistor')} in {counted(counts.gates, 'gate')}, "
        f"{counted(counts.nets, 'net')}; total width {engineering(analysis.total_width, 'm')}, "
        f"switched capacitance {engineering(analysis.switched_cap, 'F')}, "
        f"slowest transition {engineering(analysis.worst_transition, 's')}"
    )
    process = (
        f"{yardstick.process}: tau {engineering(yardstick.tau, 's')}, "
        f"FO4 {engineering(yardstick.fo4, 's')}, p_inv {yardstick.p_inv:.3g}"
    )
    lines = labelled(paper, "size", size)
    if analysis.input_caps:
        lines += labelled(paper, "inputs", _inputs(paper, analysis))
    return [*lines, *labelled(paper, "process", process)]


def _inputs(paper: Paper, analysis: Analysis) -> str:
    """Return what the inputs weigh, those that differ in numbers only in one figure or range."""
    families: dict[str, list[tuple[str, float]]] = {}
    for net, cap in analysis.input_caps:
        families.setdefault(family_of(net), []).append((net, cap))
    scale = Scale.of((cap for _, cap in analysis.input_caps), "F", digits=3)
    texts = [_input_family(paper, group, scale) for group in families.values()]
    return listed(texts, _INPUTS_SHOWN)


def _input_family(paper: Paper, group: Sequence[tuple[str, float]], scale: Scale) -> str:
    name = family_name([net for net, _ in group])
    caps = [cap for _, cap in group]
    ends = dict.fromkeys([scale.text(min(caps)), scale.text(max(caps))])
    many = f"{len(group)} {paper.times} " if len(group) > 1 else ""
    return f"{many}{name} {' to '.join(ends)}"
