"""Processes fitted to some cells of an open library, and judged on the others.

Fitted on small inverters, NANDs, NORs, AOI21, OAI21 and the smallest buffers, ANDs and ORs (see
`support.open_timing`); judged on every other combinational cell without pass transistors, at the
characterised points whose transitions and loads occur in practice: transitions from 0.8 times that
of a chain of inverters driving one to 1.2 times that of one driving eight, loads from 0.35 to 12
times the inverter's own input at equal drive. Delays below half that of an inverter driving one are
left out: relative error means nothing there.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np
from scipy.stats import spearmanr

from evenstage.fitting.fit import fit
from evenstage.fitting.prediction import arc_graphs, build_predictor
from evenstage.pattern import Pattern
from evenstage.process.process import Process, Transistor
from support.open_timing import OpenLibrary, Table, along_a_chain

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator, Mapping, Sequence
    from pathlib import Path

    from evenstage.circuit.network import BoolArray
    from evenstage.fitting.bench import Bench
    from evenstage.fitting.measurements import Measurements, Query
    from evenstage.fitting.prediction import ArcGraph, Predicted
    from evenstage.fitting.results import Fit
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.process.process import Polarity

LIBRARIES: Final = ("ihp_sg13g2", "gf180_7t")

CALIBRATION: Final = {
    "ihp_sg13g2": (
        "inv_1 inv_2 inv_4 nand2_1 nand2_2 nor2_1 nor2_2 nand3_1 nor3_1 a21oi_1 o21ai_1"
        " buf_1 buf_2 and2_1 and2_2 or2_1 or2_2"
    ),
    "gf180_7t": (
        "inv_1 inv_2 inv_4 nand2_1 nand2_2 nand2_4 nor2_1 nor2_2 nor2_4 nand3_1 nor3_1 aoi21_1"
        " oai21_1 buf_1 buf_2 and2_1 and2_2 or2_1 or2_2"
    ),
}


class Figures(NamedTuple):
    """Median and 95th percentile of the error, percent: of arcs of one stage, of several, and of
    random paths; the largest of inverter chains, percent; rank correlations, both kinds of arc.
    """

    one: tuple[float, float]
    several: tuple[float, float]
    paths: tuple[float, float]
    chains: float
    order: tuple[float, float]


#: What must be reached.
MUST: Final = {
    "ihp_sg13g2": Figures((6, 25), (5, 15), (3, 8), 10, (0.97, 0.985)),
    "gf180_7t": Figures((6, 20), (5, 15), (3, 8), 10, (0.97, 0.985)),
}

CHAINS: Final = ("inv_1", "inv_2", "inv_4")
_PATHS: Final = 200
_STAGES: Final = 6
_SEED: Final = 20260817
_LOADS_MOST: Final = 4


def beginning(library: str) -> Process:
    """Return where the fit starts: round numbers."""
    names = {
        "ihp_sg13g2": ("sg13_lv_nmos", "sg13_lv_pmos", 1.2, 0.13e-6, 0.13e-6),
        "gf180_7t": ("nfet_05v0", "pfet_05v0", 5.0, 0.6e-6, 0.5e-6),
    }
    n_name, p_name, supply, n_length, p_length = names[library]

    def one(name: str, polarity: Polarity, length: float, r: float) -> Transistor:
        return Transistor(
            models=(Pattern(name),),
            polarity=polarity,
            length=length,
            r_w=r * length,
            c_gate=1.5e-9,
            c_drain=1e-9,
            stack=0.9,
            slope=0.5,
            slope_power=0.65,
            shape=2.7,
            shape_carry=0.27,
            slope_stack=0.6,
            shape_stack=0.6,
        )

    kinds = one(n_name, "n", n_length, 1e4), one(p_name, "p", p_length, 2e4)
    return Process(name=library, supply=supply, transistors=kinds)


@dataclass(frozen=True)
class Judged:
    """A library with a process fitted to its calibration cells."""

    library: OpenLibrary
    fit: Fit
    bench: Bench

    @cached_property
    def queries(self) -> tuple[Query, ...]:
        return tuple(self.library.tables)

    @cached_property
    def graphs(self) -> Sequence[ArcGraph]:
        found = arc_graphs(self.bench, self.queries)
        return [graph for graph in found if graph is not None]

    @cached_property
    def process(self) -> Process:
        """The fitted constants on the bench, which knows its own unit inverter."""
        unit = self.bench.circuit.process
        return replace(self.fit.process, unit_width=unit.unit_width, unit_ratio=unit.unit_ratio)

    @cached_property
    def rows(self) -> Measurements:
        """All points of all tables."""
        return self.library.measurements(self.library.cells)

    @cached_property
    def predicted(self) -> Predicted:
        """The prediction of all points."""
        assert len(self.graphs) == len(self.queries)
        return build_predictor(self.bench, self.graphs, self.rows)(self.process)

    @cached_property
    def tables(self) -> dict[Query, Table]:
        """The prediction in the shape of the library's tables."""
        found, begin = {}, 0
        for query, table in self.library.tables.items():
            shape, part = table.delay.shape, slice(begin, begin + table.delay.size)
            begin += table.delay.size
            found[query] = replace(
                table,
                delay=self.predicted.delay[part].reshape(shape),
                output_transition=self.predicted.output_transition[part].reshape(shape),
            )
        return found

    @cached_property
    def single(self) -> BoolArray:
        """Which arcs run through one stage."""
        return np.array([graph.level.max() == 1 for graph in self.graphs])

    @cached_property
    def held_out(self) -> BoolArray:
        """Which arcs are of cells that nothing was fitted to."""
        fitted_on = {self.library.cell(short) for short in CALIBRATION[self.library.name].split()}
        return np.array([query.subcircuit not in fitted_on for query in self.queries])

    def figures(self) -> Figures:
        """Return what is reached."""
        inside, single = self.inside, self.single[self.rows.query]
        error = self.predicted.delay[inside] / self.rows.delay[inside] - 1
        one, several = (percent(error[which[inside]]) for which in (single, ~single))
        chains = 100 * float(np.abs(self._chain_errors()).max())
        return Figures(one, several, percent(self._path_errors()), chains, self._order())

    @cached_property
    def inside(self) -> BoolArray:
        """Which points are judged."""
        library, rows = self.library, self.rows
        light, heavy = library.chain("inv_1", 1), library.chain("inv_1", 8)
        drive = np.array([library.drive(query.subcircuit) for query in self.queries])
        fanout = rows.load / (library.unit_input() * drive[rows.query])
        inside: BoolArray = (
            self.held_out[rows.query]
            & (rows.transition >= 0.8 * light[1])
            & (rows.transition <= 1.2 * heavy[1])
            & (fanout >= 0.35)
            & (fanout <= 12)
            & (rows.delay > 0.5 * light[0])
        )
        return inside

    def _order(self) -> tuple[float, float]:
        """Compare the order of held-out arcs at a fan-out of four, one stage and several."""
        library = self.library
        transition, unit = library.chain("inv_1", 4)[1], library.unit_input()

        def correlation(which: BoolArray) -> float:
            chosen = [self.queries[index] for index in np.flatnonzero(which)]
            loads = [4 * unit * library.drive(query.subcircuit) for query in chosen]
            found, true = (
                [tables[q].at(transition, load)[0] for q, load in zip(chosen, loads, strict=True)]
                for tables in (self.tables, library.tables)
            )
            return float(spearmanr(found, true).statistic)

        one, several = (correlation(self.held_out & kind) for kind in (self.single, ~self.single))
        return one, several

    def _chain_errors(self) -> FloatArray:
        """Return relative errors of delays along chains of inverters that each drive four."""
        errors = []
        for short in CHAINS:
            rise, fall = (inverter(self.library, short, rising=rising) for rising in (True, False))
            load = 4 * self._pin_cap(rise)
            found, _ = along_a_chain(self.tables[rise], self.tables[fall], load)
            errors.append(found / self.library.chain(short, 4)[0] - 1)
        return np.array(errors)

    def _path_errors(self) -> FloatArray:
        """Return relative errors of the delays of random paths, transitions handed on.

        Each stage drives one to four of the next stage's pin; the prediction takes the program's
        own pin capacitance, the reference the library's.
        """
        library, rng = self.library, np.random.default_rng(_SEED)
        by_edge: dict[bool, list[int]] = {True: [], False: []}
        for index in np.flatnonzero(self.held_out).tolist():
            if self.queries[index] in library.senses:
                by_edge[self._input_rises(self.queries[index])].append(index)
        rises = rng.integers(2, size=_PATHS).astype(bool)
        stages = []
        for _ in range(_STAGES + 1):
            chosen = [by_edge[bool(edge)][rng.integers(len(by_edge[bool(edge)]))] for edge in rises]
            stages.append([self.queries[index] for index in chosen])
            rises = np.array([self.queries[index].rising for index in chosen])
        copies = rng.integers(1, _LOADS_MOST + 1, size=(_STAGES, _PATHS))
        found, reference = (
            self._along(stages, copies, tables, pin)
            for tables, pin in (
                (self.tables, self._pin_cap),
                (library.tables, lambda q: library.input_cap(q.subcircuit, q.input)),
            )
        )
        return found / reference - 1

    def _input_rises(self, query: Query) -> bool:
        return query.rising == (self.library.senses[query] == "positive_unate")

    def _along(
        self,
        stages: Sequence[Sequence[Query]],
        copies: IntArray,
        tables: Mapping[Query, Table],
        pin: Callable[[Query], float],
    ) -> FloatArray:
        """Return the delays of paths by some tables and capacitances of pins."""
        total = np.zeros(_PATHS)
        transitions = [self.library.chain("inv_1", 4)[1]] * _PATHS
        for count, here, following in zip(copies, stages, stages[1:], strict=False):
            loads = [float(n) * pin(query) for n, query in zip(count, following, strict=True)]
            told = [
                tables[query].at(transition, load)
                for query, transition, load in zip(here, transitions, loads, strict=True)
            ]
            total += [delay for delay, _ in told]
            transitions = [leaving for _, leaving in told]
        return total

    @cached_property
    def _net_cap(self) -> FloatArray:
        return replace(self.bench.circuit, process=self.process).net_cap

    def _pin_cap(self, query: Query) -> float:
        number = self.bench.number(query.subcircuit)
        place = self.bench.cells[number].place(query.input)
        return float(self._net_cap[self.bench.net(number, place)])


def judge(name: str, folder: Path, without: Mapping[str, float] | None = None) -> Judged:
    """Fit a process to the calibration cells of a library, some of its constants given."""
    library, given = OpenLibrary(name), without or {}
    path, start = library.netlist(folder), beginning(name)
    kinds = tuple(replace(one, **given) for one in start.transistors)  # type: ignore[arg-type] # every key is a float field
    start = replace(start, transistors=kinds)
    chosen = [library.cell(short) for short in CALIBRATION[name].split()]
    cells, _ = library.on_bench(chosen, path, start)
    result = fit(library.measurements(chosen), cells, path, start, source=name, keep=given)
    _, bench = library.on_bench(library.cells, path, start)
    return Judged(library, result, bench)


def inverter(library: OpenLibrary, short: str, *, rising: bool) -> Query:
    cell = library.cell(short)
    return next(q for q in library.tables if q.subcircuit == cell and q.rising == rising)


def percent(error: FloatArray) -> tuple[float, float]:
    """Return median and 95th percentile of the size of errors, in percent."""
    size = 100 * np.abs(error)
    return float(np.median(size)), float(np.quantile(size, 0.95))


def missed(found: Figures, must: Figures) -> set[str]:
    """Name the figures that are not what they must be."""
    names = {
        name
        for name in ("one", "several", "paths", "chains")
        if (np.array(getattr(found, name)) > getattr(must, name)).any()
    }
    return names | ({"order"} if (np.array(found.order) < must.order).any() else set())


class WorstPoint(NamedTuple):
    """The worst point of an arc: its name, error as part of one, transition (s) and load (F)."""

    name: str
    error: float
    transition: float
    load: float
    stages: int


def worst_points(judged: Judged, count: int = 10) -> Iterator[WorstPoint]:
    """Yield the arcs with the largest errors, the largest first."""
    rows, inside = judged.rows, np.flatnonzero(judged.inside)
    error = judged.predicted.delay[inside] / rows.delay[inside] - 1
    met = set[int]()
    for place in np.argsort(-np.abs(error), kind="stable"):
        point = inside[place]
        number = int(rows.query[point])
        if number not in met and len(met) < count:
            met.add(number)
            query = judged.queries[number]
            edge = "rise" if query.rising else "fall"
            yield WorstPoint(
                f"{judged.library.short(query.subcircuit)} {query.input} {edge}",
                float(error[place]),
                float(rows.transition[point]),
                float(rows.load[point]),
                int(judged.graphs[number].level.max()),
            )
