"""The delays that the makers of two open cell libraries characterised, as measurements.

The libraries are not part of the project; `OPEN_CELLS` is the folder beside the checkout that may
hold them. Transitions are turned into ramps over the full swing by each library's own thresholds
and derating. Where one arc has rows for several states of the other inputs the unconditional row
counts. Where rows of one arc go both ways, as those of exclusive ors do, the slowest row counts
point by point: the unconditional rows of the first library's exclusive ors hold the way through one
stage alone, up to a third faster than the rows for the other state of the other input.
"""

from __future__ import annotations

import json
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from scipy.interpolate import RegularGridInterpolator

from evenstage.brief import Brief
from evenstage.fitting.bench import Bench, Cell, build_bench, look_at
from evenstage.fitting.measurements import Measurements, Query
from evenstage.netlist.reading.read import read
from evenstage.pattern import Pattern

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from evenstage.netlist.devices import FloatArray
    from evenstage.process.process import Process

OPEN_CELLS: Final = Path(__file__).parents[3] / "shared" / "data"

_PREFIX: Final = {"ihp_sg13g2": "sg13g2_", "gf180_7t": "gf180mcu_fd_sc_mcu7t5v0__"}

#: Cells of pass transistors.
_WITH_PASSES: Final = ("mux2", "mux4")

_CHAIN_TURNS: Final = 60


@dataclass(frozen=True)
class Table:
    """Delay and output transition of one arc over its characterised grid, s."""

    transition: FloatArray
    load: FloatArray
    delay: FloatArray
    output_transition: FloatArray

    def at(self, transition: float, load: float) -> tuple[float, float]:
        """Return delay and output transition between the points of the grid."""
        return float(self._delay((transition, load))), float(self._leaving((transition, load)))

    @cached_property
    def _delay(self) -> RegularGridInterpolator:
        return self._over(self.delay)

    @cached_property
    def _leaving(self) -> RegularGridInterpolator:
        return self._over(self.output_transition)

    def _over(self, values: FloatArray) -> RegularGridInterpolator:
        axes = (self.transition, self.load)
        return RegularGridInterpolator(axes, values, bounds_error=False, fill_value=None)


def along_a_chain(rise: Table, fall: Table, load: float) -> tuple[float, float]:
    """Return delay and transition of an endless chain of inverters, means of both edges."""
    transition = float(rise.transition[1])
    for _ in range(_CHAIN_TURNS):
        up, going_up = rise.at(transition, load)
        down, transition = fall.at(going_up, load)
    return (up + down) / 2, (going_up + transition) / 2


@dataclass(frozen=True)
class OpenLibrary:
    """One library by its name in the data folder."""

    name: str

    @cached_property
    def _timing(self) -> dict[str, Any]:
        libraries = json.loads((OPEN_CELLS / "timing.json").read_text())["libraries"]
        return dict(libraries[self.name])

    @cached_property
    def _facts(self) -> dict[str, Any]:
        return dict(json.loads((OPEN_CELLS / "cells.json").read_text())[self.name])

    def short(self, cell: str) -> str:
        """Return the name of a cell without the library's prefix."""
        return cell.removeprefix(_PREFIX[self.name])

    def cell(self, short: str) -> str:
        return _PREFIX[self.name] + short

    @cached_property
    def cells(self) -> tuple[str, ...]:
        """The characterised combinational cells without pass transistors."""
        return tuple(n for n in self._timing["cells"] if not self.short(n).startswith(_WITH_PASSES))

    def drive(self, cell: str) -> float:
        return float(self._timing["cells"][cell]["drive"])

    def input_cap(self, cell: str, pin: str) -> float:
        """Return the capacitance of a pin, F."""
        return float(self._timing["cells"][cell]["inputs"][pin]["capacitance"]) * 1e-12

    @property
    def _full_swing(self) -> float:
        low, high = map(float, self._timing["slew_thresholds_pct"])
        return float(self._timing["slew_derate"]) * 100 / (high - low)

    @cached_property
    def tables(self) -> dict[Query, Table]:
        """The table of every arc."""
        found: dict[Query, list[dict[str, Any]]] = {}
        for cell in self.cells:
            for output, facts in self._timing["cells"][cell]["outputs"].items():
                for arc in facts["arcs"]:
                    if arc["timing_type"] == "combinational":
                        for rising in (True, False):
                            query = Query(cell, arc["related_pin"], output, rising)
                            found.setdefault(query, []).append(arc)
        return {query: self._slowest(query, arcs) for query, arcs in found.items()}

    @cached_property
    def senses(self) -> dict[Query, str]:
        """Whether an output moves with its input, where that is always so."""
        found: dict[Query, set[str]] = {}
        for cell in self.cells:
            for output, facts in self._timing["cells"][cell]["outputs"].items():
                for arc in facts["arcs"]:
                    for rising in (True, False):
                        query = Query(cell, arc["related_pin"], output, rising)
                        found.setdefault(query, set()).add(arc["timing_sense"])
        return {query: kinds.pop() for query, kinds in found.items() if len(kinds) == 1}

    def _slowest(self, query: Query, arcs: list[dict[str, Any]]) -> Table:
        senses = {arc["timing_sense"] for arc in arcs}
        both = {"positive_unate", "negative_unate"} <= senses
        plain = arcs if both else [arc for arc in arcs if arc["when"] is None] or arcs
        edge = "rise" if query.rising else "fall"
        delays = np.stack([np.array(arc[f"cell_{edge}"]["values"]) for arc in plain])
        leaving = np.stack([np.array(arc[f"{edge}_transition"]["values"]) for arc in plain])
        which = delays.argmax(axis=0)[None]
        grid = plain[0][f"cell_{edge}"]
        swing = self._full_swing * 1e-9
        return Table(
            transition=np.array(grid["index_1"]) * swing,
            load=np.array(grid["index_2"]) * 1e-12,
            delay=np.take_along_axis(delays, which, 0)[0] * 1e-9,
            output_transition=np.take_along_axis(leaving, which, 0)[0] * swing,
        )

    def measurements(self, cells: Iterable[str], *, every: int = 1) -> Measurements:
        """Return the tables of some cells as measurements, every so many loads of them."""
        wanted = set(cells)
        queries = tuple(query for query in self.tables if query.subcircuit in wanted)
        parts = [self._rows(index, query, every) for index, query in enumerate(queries)]
        rows = np.concatenate(parts, axis=1)
        return Measurements(
            queries=queries,
            query=rows[0].astype(np.int32),
            transition=rows[1],
            load=rows[2],
            delay=rows[3],
            output_transition=rows[4],
            input_cap=rows[5],
        )

    def _rows(self, index: int, query: Query, every: int) -> FloatArray:
        table = self.tables[query]
        transition, load = np.meshgrid(table.transition, table.load[::every], indexing="ij")
        shape = transition.shape
        columns = (
            np.full(shape, index),
            transition,
            load,
            table.delay[:, ::every],
            table.output_transition[:, ::every],
            np.full(shape, self.input_cap(query.subcircuit, query.input)),
        )
        return np.stack([column.ravel() for column in columns])

    def unit_input(self) -> float:
        """Return the input capacitance of the smallest inverter, F."""
        cell = self.cell("inv_1")
        return self.input_cap(cell, next(q.input for q in self.tables if q.subcircuit == cell))

    def resampled(self, cells: Iterable[str]) -> Measurements:
        """Return what a designer would measure: cells in the surroundings of inverter chains.

        Transitions are those of chains of inverters that drive one, two, four, eight and sixteen of
        themselves, loads half to sixteen times the input of an inverter of equal drive; between the
        points of a table its makers' own linear rule counts.
        """
        wanted = set(cells)
        queries = tuple(query for query in self.tables if query.subcircuit in wanted)
        transitions = [self.chain("inv_1", fanout)[1] for fanout in (1, 2, 4, 8, 16)]
        unit = self.unit_input()
        rows = [
            (index, transition, load, *self.tables[query].at(transition, load), pin)
            for index, query in enumerate(queries)
            for pin in [self.input_cap(query.subcircuit, query.input)]
            for transition in transitions
            for fanout in (0.5, 1, 2, 4, 8, 16)
            for load in [fanout * unit * self.drive(query.subcircuit)]
        ]
        columns = np.array(rows).T
        return Measurements(
            queries=queries,
            query=columns[0].astype(np.int32),
            transition=columns[1],
            load=columns[2],
            delay=columns[3],
            output_transition=columns[4],
            input_cap=columns[5],
        )

    def chain(self, short: str, fanout: float) -> tuple[float, float]:
        """Return delay and transition of an endless chain of one inverter, means of both edges."""
        cell = self.cell(short)
        rise, fall = (
            next(q for q in self.tables if q.subcircuit == cell and q.rising is rising)
            for rising in (True, False)
        )
        load = fanout * self.input_cap(cell, rise.input)
        return along_a_chain(self.tables[rise], self.tables[fall], load)

    def netlist(self, folder: Path) -> Path:
        """Return a netlist of all cells; one that includes them is written into a folder."""
        if self.name == "ihp_sg13g2":
            return OPEN_CELLS / self.name / "sg13g2_stdcell.spice"
        path = folder / "cells.sp"
        files = sorted((OPEN_CELLS / self.name).glob("*.cdl"))
        path.write_text("".join(f'.include "{file}"\n' for file in files))
        return path

    def on_bench(
        self, names: Sequence[str], path: Path, process: Process
    ) -> tuple[tuple[Cell, ...], Bench]:
        """Put cells on a bench."""
        netlist = read(path)
        cells = tuple(look_at(netlist, name, process, self._brief(name)) for name in names)
        return cells, build_bench(path, cells, process)

    def _brief(self, cell: str) -> Brief:
        facts = self._facts[cell]
        return Brief(
            supplies_high=tuple(map(Pattern, facts["power"])),
            supplies_low=tuple(map(Pattern, facts["ground"])),
        )
