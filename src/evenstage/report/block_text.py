"""What a report says of the whole block: path ends, sizes, notices, and how far to trust it."""

from __future__ import annotations

import re
from itertools import islice
from typing import TYPE_CHECKING, Final

from evenstage.report.families import family_name, family_of, gathered
from evenstage.report.scale import Scale
from evenstage.report.table import Column, first_that_fits
from evenstage.report.words import counted, labelled, listed, punctuality
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from evenstage.errors import Notice
    from evenstage.report.paper import Paper
    from evenstage.timing.results import Analysis, PathEnd

#: Reasons for a path end that need no telling.
_EXPECTED: Final = {"output", "asked for"}

_ENDS_SHOWN: Final = 10
_INPUTS_SHOWN: Final = 8
_MESSAGES_SHOWN: Final = 3
_NAMES_SHOWN: Final = 5

CAUTION: Final = (
    "An estimate from resistances and capacitances, not sign-off: simulate at all corners with the "
    "foundry's models. Electromigration, noise, hold and reliability limits are not checked. "
    "Follow your organisation's review and local rules, above all where a failure of the circuit "
    "can hurt someone."
)


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


def notice_lines(paper: Paper, notices: Iterable[Notice]) -> list[str]:
    """Return notices grouped by what they are about, with their number."""
    groups: dict[str, list[Notice]] = {}
    for notice in dict.fromkeys(notices):
        groups.setdefault(notice.code, []).append(notice)
    return [line for code, group in groups.items() for line in _group_lines(paper, code, group)]


def _group_lines(paper: Paper, code: str, group: Sequence[Notice]) -> list[str]:
    if len(group) == 1:
        return paper.paragraph(f"{code}: {_told(paper, group[0])}", indent=2, hanging=4)
    lines = paper.paragraph(f"{code}, {len(group)} times", indent=2)
    shown = group if len(group) == _MESSAGES_SHOWN + 1 else group[:_MESSAGES_SHOWN]
    for notice in shown:
        lines += paper.paragraph(_told(paper, notice), indent=4, hanging=6)
    if len(shown) < len(group):
        lines.append(f"    and {len(group) - len(shown)} more")
    return lines


def _told(paper: Paper, notice: Notice) -> str:
    """Return a notice with the first of the names it is about, unless it names them itself."""
    names = [name for name in notice.names if name]
    if not names or any(_names(notice.message, name) for name in names):
        return str(notice)
    return f"{notice}: {listed(gathered(names, paper.times), _NAMES_SHOWN)}"


def _names(message: str, name: str) -> bool:
    """Tell whether a message names something; a single letter could be any word's."""
    word = rf"(?<![\w.]){re.escape(name)}(?![\w.])"
    return f"'{name}'" in message or (len(name) > 1 and bool(re.search(word, message)))


def finished(paper: Paper, lines: Sequence[str]) -> str:
    """Return lines and the caution every report ends with as one text."""
    return "\n".join([*lines, "", *paper.paragraph(CAUTION)]) + "\n"
