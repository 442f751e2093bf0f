"""What a block consists of, as text."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.circuit.storage.elements import FLIP_FLOP
from evenstage.circuit.supplied import are_several
from evenstage.report.families import gathered
from evenstage.report.frame import framed
from evenstage.report.paper import PLAIN, Paper
from evenstage.report.table import Column, first_that_fits
from evenstage.report.words import counted, labelled, listed, section

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.inventory import Entry, Inventory, Stored, Unknown
    from evenstage.circuit.supplied import Domain

_ENTRIES_SHOWN: Final = 60
_NAMES_SHOWN: Final = 8
_NETS_SHOWN: Final = 4
_SUPPLIES_SHOWN: Final = 6
_SUPPLIES_ROOM: Final = 16
_FAMILY_CODE: Final = "not-understood"


def inventory_report(inventory: Inventory, paper: Paper = PLAIN) -> str:
    """Return an inventory as text: the gates by subcircuit and kind, then what is left."""
    block = f"block {inventory.top}" if inventory.top else "top level"
    lines = section("Gates", _entry_lines(paper, inventory.entries))
    lines += section("Storage and other loops", _stored_lines(paper, inventory))
    lines += section("Transistors outside all logic", _outside_lines(paper, inventory))
    lines += section("Not understood, timed as loads only", _unknown_lines(paper, inventory))
    lines += section("Supplies", _supply_lines(paper, inventory))
    # What was not understood stands above already, with more of its transistors.
    told = {notice for notice in inventory.notices if notice.code == _FAMILY_CODE}
    told = {notice for notice in told if _is_told(notice.message, inventory.not_understood)}
    others = [notice for notice in inventory.notices if notice not in told]
    subject = paper.paragraph(f"{inventory.source}, {block}")
    return framed(paper, subject, _answer(inventory), lines, others)


def _is_told(message: str, unknown: Sequence[Unknown]) -> bool:
    return any(some.reason in message for some in unknown)


def _answer(inventory: Inventory) -> str:
    """Return the one thing to know first."""
    kinds = len(dict.fromkeys(entry.subcircuit for entry in inventory.entries))
    places = f" in {counted(kinds, 'subcircuit')}" if inventory.gates and inventory.top else ""
    left = sum(some.devices for some in inventory.not_understood)
    rest = f"{counted(left, 'transistor')} not understood" if left else "nothing left over"
    return (
        f"{counted(inventory.devices, 'transistor')} and {counted(inventory.nets, 'net')}: "
        f"{counted(inventory.gates, 'gate')}{places}; {rest}."
    )


def _entry_lines(paper: Paper, entries: Sequence[Entry]) -> list[str]:
    """Return a table of gates, one line per subcircuit and drawing."""
    if not entries:
        return []
    most = len(entries) if len(entries) == _ENTRIES_SHOWN + 1 else _ENTRIES_SHOWN
    by_domain = are_several(entry.supplies for entry in entries)
    rows, places = [], _places(entries[:most], by_domain=by_domain)
    for entry, place in zip(entries, places, strict=False):
        function = f"{entry.output} = {entry.function}" if entry.function else entry.output
        rows.append([*place, entry.kind, str(entry.count), str(entry.devices), function])
    columns = [
        *_place_columns(places),
        Column("kind"),
        Column("number", align="right"),
        Column("transistors", align="right"),
        Column("function of the first", kind="name"),
    ]
    # What the supplies take on narrow paper, the number of transistors gives.
    lines = _table(paper, columns, rows, spare=-2 if by_domain else None)
    if len(entries) > most:
        left = sum(entry.count for entry in entries[most:])
        lines.append(f"  and {len(entries) - most} lines more, of {counted(left, 'gate')}")
    return lines


def _stored_lines(paper: Paper, inventory: Inventory) -> list[str]:
    """Return a table of storage elements, one line per subcircuit and kind."""
    if not inventory.stored:
        return []
    # Storage on one pair of supplies is told from the gates around it, too.
    by_domain = are_several(some.supplies for some in inventory.entries)
    rows, places = [], _places(inventory.stored, by_domain=by_domain)
    for some, place in zip(inventory.stored, places, strict=True):
        clocks = ", ".join(_clock(some.kind, name, high=high) for name, high in some.clocks)
        writes = ", ".join(_level(name, high=high) for name, high in some.writes)
        nets = listed(some.nets, _NETS_SHOWN)
        data = listed(some.data, _NETS_SHOWN)
        rows.append([*place, some.kind, str(some.count), clocks, data, writes, nets])
    columns = [
        *_place_columns(places),
        Column("kind"),
        Column("number", align="right"),
        Column("clock", kind="name"),
        Column("data", kind="name"),
        Column("set, reset", kind="name"),
        Column("nets of the first", kind="name"),
    ]
    return _table(paper, columns, rows, spare=-1 if by_domain else None)


def _table(
    paper: Paper, columns: list[Column], rows: list[list[str]], *, spare: int | None
) -> list[str]:
    """Return a table; where names would become too short, without the column that is to spare."""
    choices = [(columns, rows)]
    if spare is not None:
        kept = [i for i in range(len(columns)) if i != len(columns) + spare]
        fewer = [[cells[i] for i in kept] for cells in rows]
        choices.append(([columns[i] for i in kept], fewer))
    chosen, table = first_that_fits(paper, choices, indent=2)
    return table.lines(choices[chosen][1])


def _places(some: Sequence[Entry | Stored], *, by_domain: bool) -> list[list[str]]:
    """Return the subcircuit of each, and its supplies if asked for, where they change."""
    places: list[list[str]] = []
    place: str | None = None
    supplies: Domain | None = None
    for one in some:
        same = one.subcircuit == place
        places.append(["" if same else one.subcircuit or "top level"])
        if by_domain:
            nets = listed(one.supplies.nets, _SUPPLIES_SHOWN) or "none"
            places[-1].append("" if same and one.supplies == supplies else nets)
        place, supplies = one.subcircuit, one.supplies
    return places


def _place_columns(places: Sequence[Sequence[str]]) -> list[Column]:
    """Return the columns that say where; few supplies keep their room, for they differ little."""
    first = Column("subcircuit", kind="name")
    if not places or len(places[0]) == 1:
        return [first]
    widest = max(len(nets) for _, nets in places)
    return [first, Column("supplies", kind="name" if widest > _SUPPLIES_ROOM else "number")]


def _clock(kind: str, name: str, *, high: bool) -> str:
    if kind == FLIP_FLOP:
        return f"{name} {'rising' if high else 'falling'}"
    return _level(name, high=high)


def _level(name: str, *, high: bool) -> str:
    return f"{name} {'high' if high else 'low'}"


def _outside_lines(paper: Paper, inventory: Inventory) -> list[str]:
    if not inventory.outside:
        return []
    rows, before = [], None
    for some in inventory.outside:
        place = (some.subcircuit or "top level") if some.subcircuit != before else ""
        names = listed(gathered(some.names, paper.times), _NAMES_SHOWN)
        rows.append([place, some.role, str(some.devices), names])
        before = some.subcircuit
    columns = [
        Column("subcircuit", kind="name"),
        Column("part"),
        Column("number", align="right"),
        Column("transistors", kind="name"),
    ]
    _, table = first_that_fits(paper, [(columns, rows)], indent=2)
    return table.lines(rows)


def _unknown_lines(paper: Paper, inventory: Inventory) -> list[str]:
    lines = []
    for some in inventory.not_understood:
        many = f"{counted(some.groups, 'group')}, {counted(some.devices, 'transistor')}"
        lines += paper.paragraph(f"{some.reason} ({many})", indent=2, hanging=4)
        shown = gathered(some.names, paper.times)
        more = some.devices - len(some.names)
        names = listed(shown, _NAMES_SHOWN) + (f" and {more} more" if more else "")
        lines += paper.paragraph(names, indent=6)
    return lines


def _supply_lines(paper: Paper, inventory: Inventory) -> list[str]:
    lines = []
    for label, nets in (("high", inventory.high), ("low", inventory.low)):
        lines += labelled(paper, label, listed(gathered(nets, paper.times), _SUPPLIES_SHOWN))
    return lines
