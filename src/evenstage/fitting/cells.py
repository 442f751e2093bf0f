"""The cells that measurements name, found in a netlist."""

from __future__ import annotations

import difflib
from typing import TYPE_CHECKING

from evenstage.errors import FitError
from evenstage.fitting.bench import Cell, look_at

if TYPE_CHECKING:
    from collections.abc import Iterable

    from evenstage.brief import Brief
    from evenstage.fitting.measurements import Measurements
    from evenstage.netlist.netlist import Netlist
    from evenstage.process.process import Process
    from evenstage.source import Span


def measured_cells(
    measured: Measurements, netlist: Netlist, process: Process, brief: Brief | None = None
) -> tuple[Cell, ...]:
    """Find the cells of a table in a netlist, and see that they have the pins it names.

    Raises
    ------
    FitError
        ``unknown-cell`` or ``unknown-pin``, with the place in the table.
    EvenstageError
        Where a cell does not elaborate, or its supplies cannot be found.
    """
    first: dict[int, Span] = {}
    for query, place in zip(measured.query.tolist(), measured.places, strict=False):
        first.setdefault(query, place)
    cells: dict[str, Cell] = {}
    known = [subcircuit.name for subcircuit in netlist.subcircuits.values()]
    for number, query in enumerate(measured.queries):
        name = query.subcircuit.lower()
        if name not in netlist.subcircuits:
            near = _nearest(query.subcircuit, known)
            message = f"the netlist has no subcircuit '{query.subcircuit}'{near}"
            raise FitError(message, code="unknown-cell", span=first.get(number))
        if name not in cells:
            cells[name] = look_at(netlist, query.subcircuit, process, brief)
        _check_pins(cells[name], (query.input, query.output), first.get(number))
    return tuple(cells.values())


def _check_pins(cell: Cell, pins: Iterable[str], place: Span | None) -> None:
    signals = {port.lower() for port in cell.signals}
    for pin in pins:
        if pin.lower() not in signals:
            near = _nearest(pin, cell.signals)
            message = f"'{cell.name}' has no signal pin '{pin}'{near}"
            raise FitError(message, code="unknown-pin", span=place)


def _nearest(name: str, known: Iterable[str]) -> str:
    found = difflib.get_close_matches(name, list(known), n=1, cutoff=0.0)
    return f"; the nearest is '{found[0]}'" if found else ""
