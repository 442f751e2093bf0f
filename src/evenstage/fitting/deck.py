"""A measuring deck: plain SPICE that measures the arcs of cells as a fit wants them.

Every measurement is a call of its own, with a ramp at its input and a capacitor at its output, so
that one transient analysis makes them all. The table beside it is the one that a fit reads; where
the simulator's results belong, it holds their names.
"""

from __future__ import annotations

from itertools import product
from typing import TYPE_CHECKING, Final, NamedTuple

from evenstage.errors import FitError, Notice
from evenstage.fitting.bench import build_bench
from evenstage.fitting.measurements import Query
from evenstage.fitting.reading import COLUMNS
from evenstage.fitting.results import Deck
from evenstage.fitting.side_inputs import INPUTS_MAX, CellLogic
from evenstage.netlist.reading.opening import after_title
from evenstage.source import SourceText
from evenstage.timing.yardstick import chain
from evenstage.units import suffixed

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence
    from pathlib import Path

    from evenstage.fitting.bench import Bench, Cell
    from evenstage.fitting.side_inputs import Setting
    from evenstage.process.process import Process

#: Fan-outs of the inverter chains whose transitions are applied, and of the loads.
_FANOUTS: Final = (1.0, 2.5, 6.0, 16.0)

#: Parts of the swing between which an output's transition is measured.
_LOW_POINT: Final = 0.2
_HIGH_POINT: Final = 0.8

#: The analysis ends so many of the slowest chain's delays after the last ramp.
_SETTLING: Final = 20.0

#: Time steps in the fastest ramp.
_STEPS: Final = 50.0


class _Arc(NamedTuple):
    number: int
    cell: Cell
    query: Query
    setting: Setting
    input_cap: float


def measuring_deck(cells: Sequence[Cell], netlist: Path, process: Process) -> Deck:
    """Write the deck for some cells.

    Parameters
    ----------
    cells : sequence of Cell
    netlist : Path
        The file that holds them; the deck includes it.
    process : Process
        Its inverter chains say which transitions and loads occur.

    Raises
    ------
    FitError
        ``nothing-to-measure``.
    """
    bench = build_bench(netlist, cells, process)
    arcs, lost = [], []
    for number, cell in enumerate(bench.cells):
        found = list(_arcs(bench, number))
        arcs += found
        if not found:
            lost.append(cell.name)
    if not arcs:
        raise FitError(
            "no cell with an output that its inputs decide was found; name a netlist with leaf "
            "cells",
            code="nothing-to-measure",
        )
    chains = [chain(bench.circuit.process, fanout) for fanout in _FANOUTS]
    transitions = [(one.rise + one.fall) / 2 or one.delay for one in chains]
    points = [
        _Point(row, arc, transition, fanout * arc.input_cap)
        for row, (arc, transition, fanout) in enumerate(product(arcs, transitions, _FANOUTS))
    ]
    stop = 3 * max(transitions) + _SETTLING * chains[-1].delay
    notices = [*process.notices, *_titled(netlist)]
    if lost:
        message = (
            f"{len(lost)} cells left out: no output that at most {INPUTS_MAX} inputs decide "
            f"through recognised gates, the first is '{lost[0]}'"
        )
        notices.append(Notice("cell-left-out", message, names=tuple(lost)))
    return Deck(
        cells=tuple(dict.fromkeys(arc.cell.name for arc in arcs)),
        arcs=len(arcs),
        measurements=len(points),
        text=_text(points, netlist, process.supply, stop, max(transitions), min(transitions)),
        table=_table(points),
        notices=tuple(notices),
    )


class _Point(NamedTuple):
    row: int
    arc: _Arc
    transition: float
    load: float


def _arcs(bench: Bench, number: int) -> Iterator[_Arc]:
    """Yield the arcs of a cell that its logic allows."""
    cell, logic = bench.cells[number], CellLogic(bench, number)
    if len(logic.inputs) > INPUTS_MAX:
        return
    for output in logic.outputs:
        for pin in logic.inputs if logic.knows(output) else ():
            cap = float(bench.circuit.net_cap[bench.net(number, cell.place(pin))])
            for rising in (True, False):
                setting = logic.slowest(pin, output, rising=rising)
                if setting is not None:
                    query = Query(cell.name, pin, output, rising)
                    yield _Arc(number, cell, query, setting, cap)


def _titled(netlist: Path) -> Iterator[Notice]:
    """Give a notice if simulators would read a netlist's title as a card."""
    source = SourceText(netlist.resolve(), netlist.read_bytes(), str(netlist))
    title, _ = after_title(source, None)
    if title and not source.data[:title].lstrip().startswith(b"*"):
        message = (
            f"'{netlist}' begins with a title, and the deck includes it: simulators read the first "
            "line of an included file as a card; put '*' before it"
        )
        yield Notice("title-included", message, f"{netlist}:1:1")


def _text(
    points: Sequence[_Point], netlist: Path, supply: float, stop: float, begin: float, least: float
) -> str:
    lines = [
        f"* {len(points)} delays of the cells in {netlist.name}, for evenstage fit",
        "* Add the models of your process and its options here; the supply is a parameter.",
        "* Each dN is a delay from half to half of the supply, each tN the output's transition",
        "* as a ramp over the full swing. They belong into the table beside this file.",
        f'.include "{netlist.resolve()}"',
        f".param supply={suffixed(supply)}",
        "vhigh high 0 'supply'",
        f".tran {suffixed(least / _STEPS, 3)} {suffixed(stop, 4)}",
    ]
    for point in points:
        lines += _cards(point, begin)
    return "\n".join([*lines, ".end", ""])


def _cards(point: _Point, begin: float) -> list[str]:
    row, arc = point.row, point.arc
    nets = dict.fromkeys(arc.cell.high, "high") | dict.fromkeys(arc.cell.low, "0")
    nets |= {port: "high" if value else "0" for port, value in arc.setting.others}
    nets |= {arc.query.input: f"i{row}", arc.query.output: f"o{row}"}
    # What is neither measured nor an input is another output: it hangs free.
    pins = " ".join(nets.get(port, f"n{row}_{place}") for place, port in enumerate(arc.cell.ports))
    first, last = ("0", "'supply'") if arc.setting.rising_input else ("'supply'", "0")
    edge = "rise" if arc.query.rising else "fall"
    ways = (_LOW_POINT, _HIGH_POINT) if arc.query.rising else (_HIGH_POINT, _LOW_POINT)
    start, end = (f"val='{part:g}*supply' {edge}=1" for part in ways)
    moves = "rise" if arc.setting.rising_input else "fall"
    at, over = suffixed(begin, 6), suffixed(begin + point.transition, 6)
    return [
        f"x{row} {pins} {arc.cell.name}",
        f"v{row} i{row} 0 pwl(0 {first} {at} {first} {over} {last})",
        f"c{row} o{row} 0 {suffixed(point.load, 6)}",
        (
            f".measure tran d{row} trig v(i{row}) val='0.5*supply' {moves}=1 "
            f"targ v(o{row}) val='0.5*supply' {edge}=1"
        ),
        f".measure tran s{row} trig v(o{row}) {start} targ v(o{row}) {end}",
        f".measure tran t{row} param='s{row}/{_HIGH_POINT - _LOW_POINT:g}'",
    ]


def _table(points: Sequence[_Point]) -> str:
    lines = [",".join(COLUMNS)]
    for row, arc, transition, load in points:
        query = arc.query
        texts = (query.subcircuit, query.input, query.output, "rise" if query.rising else "fall")
        numbers = (suffixed(transition, 6), suffixed(load, 6), f"d{row}", f"t{row}", "")
        lines.append(",".join((*map(_field, texts), *numbers)))
    return "\n".join([*lines, ""])


def _field(text: str) -> str:
    """Return a field, between quotes where it would not be read back alone."""
    quoted = text.replace('"', '""')
    return f'"{quoted}"' if any(mark in text for mark in ',"#') else text
