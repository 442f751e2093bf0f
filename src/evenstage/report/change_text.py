"""The changes of a sizing as a table: one block per gate, gates that change alike together."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.families import family_name, family_of
from evenstage.report.scale import Scale, plain
from evenstage.report.table import Column, first_that_fits
from evenstage.report.words import counted

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from evenstage.report.paper import Paper
    from evenstage.sizing.results import Change

_GATES_SHOWN: Final = 40

_COLUMNS: Final = (
    Column("gate", kind="name"),
    Column("", before=1),
    Column("cards", kind="name"),
    Column("sets", kind="name"),
    Column("old", align="right"),
    Column("new", align="right"),
    Column("factor", align="right"),
    Column("alone", align="right"),
    Column("last", align="right"),
    Column("written in", kind="name"),
    Column("why"),
)
_PLACE, _WHY = 9, 10

#: The changes of gates that differ in the numbers of their names only.
_Gates = list["Change"]


def change_lines(paper: Paper, changes: Sequence[Change]) -> list[str]:
    """Return the changes in the order of the text; of very many those that buy most."""
    gates = alike_changes(changes)
    kept = _largest(gates)
    shown = [change for gate in kept for change in gate]
    if not shown:
        return []
    widths = [value for change in shown for value in (change.old, change.new)]
    width = Scale.of(widths, "m").trimmed(widths)
    effects = [effect for change in shown for effect in (change.alone, change.last)]
    alone = Scale.of(effects, "s", digits=3)
    only = one_file(changes)
    rows = [row for gate in kept for row in _gate_rows(paper, gate, width, alone, only)]
    units = ["", "", "", "", width.unit, width.unit, "", alone.unit, alone.unit, "", ""]
    columns = [*_COLUMNS]
    if only:
        columns[_PLACE] = Column("line", align="right")
    everything = range(len(columns))
    choices = [everything, everything[:_WHY], everything[:_PLACE]]
    options = [([columns[i] for i in c], [[row[i] for i in c] for row in rows]) for c in choices]
    index, table = first_that_fits(paper, options, indent=2)
    lines = [table.titles(), table.line(*(units[i] for i in choices[index]))]
    lines += [table.line(*row) for row in options[index][1]]
    left = _gate_count(changes) - _gate_count(shown)
    if left:
        lines.append(f"  and {counted(left, 'card')} more that buy less, all of them in the JSON")
    return lines


def alike_changes(changes: Sequence[Change]) -> list[_Gates]:
    """Return the changes by gate, gates of one family that change alike together."""
    gates: dict[str, list[Change]] = {}
    for change in changes:
        gates.setdefault(change.instance, []).append(change)
    families: dict[tuple[object, ...], _Gates] = {}
    for instance, gate in gates.items():
        alike = [(c.card, c.parameter, c.old, c.new, c.alone, c.last, c.why) for c in gate]
        families.setdefault((family_of(instance), *alike), []).extend(gate)
    return list(families.values())


def _largest(gates: Sequence[_Gates]) -> list[_Gates]:
    """Return the gates that buy most, in their old order."""
    most = [max(abs(change.alone) for change in gate) for gate in gates]
    order = sorted(range(len(gates)), key=lambda i: (-most[i], i))
    return [gates[i] for i in sorted(order[:_GATES_SHOWN])]


def change_words(changes: Sequence[Change]) -> str:
    """Return what the columns of the table mean."""
    text = (
        "alone: how the worst delay moves if only that gate changes; last: how it moves by that "
        "gate when all others have changed. Less is faster. Drawn widths of one copy."
    )
    if file := one_file(changes):
        text += f" Lines are those of {file}."
    if none_helps_alone(changes):
        text += (
            " No change helps alone: a wider gate loads the one before it until that is wider too. "
            "Together they do."
        )
    return text


def none_helps_alone(changes: Sequence[Change]) -> bool:
    """Tell whether every change by itself makes the block slower or leaves it as it is."""
    return all(change.alone >= 0 for change in changes)


def one_file(changes: Sequence[Change]) -> str:
    """Return the file in which all changes are written, or nothing where they are several."""
    files = {change.file for change in changes}
    return files.pop() if len(files) == 1 else ""


def _gate_rows(
    paper: Paper, gate: _Gates, width: Scale, alone: Scale, only: str
) -> list[list[str]]:
    """Return the rows of a gate: cards that get the same width share one."""
    alike: dict[tuple[str, float, float], list[Change]] = {}
    for change in gate:
        alike.setdefault((change.parameter, change.old, change.new), []).append(change)
    instances = list(dict.fromkeys(change.instance for change in gate))
    places = {change.instance: change.occurrences for change in gate}
    many = sum(places.values())
    names = [family_name(instances), f"{paper.times}{many}" if many > 1 else ""]
    buys = [
        [signed(alone.number(effect)) for effect in (cards[0].alone, cards[0].last)]
        for cards in alike.values()
    ]
    return [
        [
            *(["", ""] if row else names),
            " ".join(dict.fromkeys(change.card for change in cards)),
            parameter,
            width.number(old),
            width.number(new),
            factor(paper, old, new),
            # Once for the gate, unless its sides have sizes of their own.
            *(["", ""] if row and len(set(map(tuple, buys))) == 1 else buys[row]),
            place(cards) if only else f"{cards[0].file}:{place(cards)}",
            cards[0].why,
        ]
        for row, ((parameter, old, new), cards) in enumerate(alike.items())
    ]


def place(changes: Sequence[Change], dash: str = "-") -> str:
    """Return the first and the last line of the changes in the file of the first one."""
    file = changes[0].file
    lines = [change.line for change in changes if change.file == file]
    last = f"{dash}{max(lines)}" if max(lines) > min(lines) else ""
    return f"{min(lines)}{last}"


def signed(number: str) -> str:
    """Return a number with its sign, zero without."""
    return number if number.startswith("-") or float(number) == 0 else f"+{number}"


def factor(paper: Paper, old: float, new: float) -> str:
    """Return how many times as wide, as in ``×2.07``."""
    ratio = new / old
    return paper.times + plain(ratio, 2 if ratio < 99.995 else 0)


def _gate_count(changes: Iterable[Change]) -> int:
    return len({change.instance for change in changes})


def card_count(changes: Sequence[Change]) -> str:
    """Return how many gates' cards change, in words."""
    return counted(_gate_count(changes), "card")
