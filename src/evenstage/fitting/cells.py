"""The cells that measurements name, found in a netlist."""

from __future__ import annotations

import difflib
from contextlib import suppress
from typing import TYPE_CHECKING

from evenstage.brief import Brief
from evenstage.circuit.recognise import recognise
from evenstage.errors import CircuitError, ElaborationError, FitError
from evenstage.fitting.bench import Cell, look_at
from evenstage.netlist.elaboration.elaborate import elaborate

if TYPE_CHECKING:
    from collections.abc import Iterable

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


def leaf_cells(netlist: Netlist, process: Process, brief: Brief | None = None) -> tuple[Cell, ...]:
    """Find the subcircuits that are one gate each and nothing else, as drawn by default.

    Raises
    ------
    FitError
        ``no-leaf`` where there are none.
    """
    given = brief or Brief()
    supplies = Brief(supplies_high=given.supplies_high, supplies_low=given.supplies_low)
    cells = []
    for subcircuit in netlist.subcircuits.values():
        # What does not stand on its own is no cell: it needs parameters, or has no supply.
        with suppress(ElaborationError, CircuitError):
            devices = elaborate(netlist, subcircuit.name, process, supplies)
            circuit = recognise(devices, process, supplies)
            if len(circuit) == 1 and not circuit.not_understood:
                cells.append(look_at(netlist, subcircuit.name, process, supplies))
    if not cells:
        raise FitError(
            f"'{netlist.sources[0].label}' has no subcircuit that is one gate with its widths",
            code="no-leaf",
        )
    return tuple(cells)


def standing_alone(
    netlist: Netlist, process: Process, brief: Brief | None = None
) -> tuple[Cell, ...]:
    """Find the subcircuits with supplies that call no other subcircuit, in their order.

    Raises
    ------
    FitError
        ``no-leaf`` where there are none.
    """
    given = brief or Brief()
    supplies = Brief(supplies_high=given.supplies_high, supplies_low=given.supplies_low)
    cells = []
    for subcircuit in netlist.subcircuits.values():
        with suppress(ElaborationError, CircuitError):
            cell = look_at(netlist, subcircuit.name, process, supplies)
            if cell.is_leaf and cell.high and cell.low:
                cells.append(cell)
    if not cells:
        raise FitError(
            f"'{netlist.sources[0].label}' has no subcircuit with supplies that calls no other",
            code="no-leaf",
        )
    return tuple(cells)


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
