"""A bench: one block in which every measured cell stands once, its pins on nets of their own.

The block is built as text and goes the way of every netlist, through reading, elaboration and
recognition, so that a cell on the bench is what it is in a design.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.brief import Brief
from evenstage.circuit.recognise import recognise
from evenstage.circuit.supplies import find_supplies
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.opening import after_title
from evenstage.netlist.reading.read import read_bytes
from evenstage.pattern import Pattern
from evenstage.source import SourceText

if TYPE_CHECKING:
    from collections.abc import Iterable
    from pathlib import Path

    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.netlist import Netlist
    from evenstage.process.process import Process

_HIGH, _LOW, _TOP = "bench_high", "bench_low", "bench_of_cells"


@dataclass(frozen=True)
class Cell:
    """A cell with the part each of its ports plays.

    Parameters
    ----------
    name : str
        As the netlist writes it.
    ports : tuple of str
        In order.
    high, low : frozenset of str
        Supply ports.
    is_leaf : bool
        Whether it calls no other subcircuit.
    """

    name: str
    ports: tuple[str, ...]
    high: frozenset[str]
    low: frozenset[str]
    is_leaf: bool = True

    @property
    def signals(self) -> tuple[str, ...]:
        """The ports that are no supplies, in order."""
        return tuple(port for port in self.ports if port not in self.high | self.low)

    def place(self, port: str) -> int:
        """Return the place of a signal port among them, known by its name in any case."""
        return [signal.lower() for signal in self.signals].index(port.lower())


@dataclass(frozen=True)
class Bench:
    """Cells side by side.

    Parameters
    ----------
    cells : tuple of Cell
    circuit : Circuit
        Nothing but what is measured hangs on its outputs.
    """

    cells: tuple[Cell, ...]
    circuit: Circuit

    def number(self, name: str) -> int:
        """Return the place of a cell, known by its name in any case."""
        return next(i for i, cell in enumerate(self.cells) if cell.name.lower() == name.lower())

    def net(self, cell: int, place: int) -> int:
        """Return the net id of a signal port of a cell, by its place among them."""
        net = self.circuit.net_id(_net(cell, place))
        assert net is not None
        return net


def look_at(netlist: Netlist, name: str, process: Process, brief: Brief | None = None) -> Cell:
    """Find the ports and supplies of a subcircuit.

    Raises
    ------
    EvenstageError
        Where it does not elaborate, or its supplies cannot be found.
    """
    devices = elaborate(netlist, name, process, brief)
    supplies = find_supplies(devices, brief)
    ports = tuple(devices.net_names[net] for net in devices.ports)
    high, low = (
        frozenset(port for port, net in zip(ports, devices.ports, strict=True) if some[net])
        for some in (supplies.is_high, supplies.is_low)
    )
    return Cell(devices.top, ports, high, low, len(devices.instance_parent) == 1)


def build_bench(path: Path, cells: Iterable[Cell], process: Process) -> Bench:
    """Put cells of a netlist file on a bench.

    Raises
    ------
    EvenstageError
        Where the file cannot be read, or holds no gate.
    """
    cells = tuple(cells)
    data = path.read_bytes()
    title, _ = after_title(SourceText(path.resolve(), data, str(path)), None)
    # The bench stands inside the file: an included file would have no title, nor cards after .end.
    lines = [*([""] if title else []), f".subckt {_TOP} {_HIGH} {_LOW}"]
    lines += [
        f"x{number} {' '.join(_at(number, cell, port) for port in cell.ports)} {cell.name}"
        for number, cell in enumerate(cells)
    ]
    bench = "\n".join([*lines, ".ends", ""]).encode("utf-8", "surrogateescape")
    text = data[:title] + bench + data[title:]
    netlist = read_bytes(text, f"bench of {path.name}", path.parent)
    brief = Brief(supplies_high=(Pattern(_HIGH),), supplies_low=(Pattern(_LOW),))
    devices = elaborate(netlist, _TOP, process, brief)
    circuit = recognise(devices, process, brief)
    return Bench(cells, replace(circuit, outside_cap=np.zeros(len(devices.net_names))))


def _at(number: int, cell: Cell, port: str) -> str:
    if port in cell.high:
        return _HIGH
    return _LOW if port in cell.low else _net(number, cell.signals.index(port))


def nets_at(place: int) -> str:
    """Return a pattern that fits the nets of the signal ports at one place of every cell."""
    return f"pin{place}_*"


def _net(number: int, place: int) -> str:
    return f"pin{place}_{number}"
