"""What a block consists of, as text."""

from __future__ import annotations

from itertools import islice
from typing import TYPE_CHECKING, Final

from evenstage.circuit.storage.elements import FLIP_FLOP
from evenstage.report.families import gathered
from evenstage.report.frame import framed
from evenstage.report.paper import PLAIN, Paper
from evenstage.report.table import Column, first_that_fits
from evenstage.report.words import counted, labelled, listed, section

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.inventory import Entry, Inventory, Unknown

_ENTRIES_SHOWN: Final = 60
_NAMES_SHOWN: Final = 8
_NETS_SHOWN: Final = 4
_SUPPLIES_SHOWN: Final = 6
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
    rows, before = [], None
    for entry in islice(entries, most):
        place = (entry.subcircuit or "top level") if entry.subcircuit != before else ""
        function = f"{entry.output} = {entry.function}" if entry.function else entry.output
        rows.append([place, entry.kind, str(entry.count), str(entry.devices), function])
        before = entry.subcircuit
    columns = [
        Column("subcircuit", kind="name"),
        Column("kind"),
        Column("number", align="right"),
        Column("transistors", align="right"),
        Column("function of the first", kind="name"),
    ]
    _, table = first_that_fits(paper, [(columns, rows)], indent=2)
    lines = table.lines(rows)
    if len(entries) > most:
        left = sum(entry.count for entry in entries[most:])
        lines.append(f"  and {len(entries) - most} lines more, of {counted(left, 'gate')}")
    return lines


def _stored_lines(paper: Paper, inventory: Inventory) -> list[str]:
    """Return a table of storage elements, one line per subcircuit and kind."""
    if not inventory.stored:
        return []
    rows, before = [], None
    for some in inventory.stored:
        place = (some.subcircuit or "top level") if some.subcircuit != before else ""
        clocks = ", ".join(_clock(some.kind, name, high=high) for name, high in some.clocks)
        writes = ", ".join(_level(name, high=high) for name, high in some.writes)
        nets = listed(some.nets, _NETS_SHOWN)
        data = listed(some.data, _NETS_SHOWN)
        rows.append([place, some.kind, str(some.count), clocks, data, writes, nets])
        before = some.subcircuit
    columns = [
        Column("subcircuit", kind="name"),
        Column("kind"),
        Column("number", align="right"),
        Column("clock", kind="name"),
        Column("data", kind="name"),
        Column("set, reset", kind="name"),
        Column("nets of the first", kind="name"),
    ]
    _, table = first_that_fits(paper, [(columns, rows)], indent=2)
    return table.lines(rows)


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
