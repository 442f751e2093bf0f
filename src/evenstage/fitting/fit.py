"""Measurements to a fitted process, with all that is to be said about it."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import Notice
from evenstage.fitting.bench import build_bench
from evenstage.fitting.certainty import at_bound, find_confusions, is_measured, standard_errors
from evenstage.fitting.constants import unknowns_of
from evenstage.fitting.prediction import arc_graphs, build_predictor
from evenstage.fitting.results import Fit, FittedConstant, Residuals
from evenstage.fitting.solver import Problem, errors
from evenstage.pattern import Pattern
from evenstage.process.generic import GENERIC_NOTICE
from evenstage.timing.yardstick import yardstick

if TYPE_CHECKING:
    from collections.abc import Collection, Sequence
    from pathlib import Path

    from evenstage.circuit.network import BoolArray
    from evenstage.fitting.bench import Bench, Cell
    from evenstage.fitting.constants import Unknown
    from evenstage.fitting.measurements import Measurements
    from evenstage.fitting.solver import Solution
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.process.process import Process

_HIGH: Final = 0.95


def fit(
    measured: Measurements,
    cells: Sequence[Cell],
    netlist: Path,
    process: Process,
    *,
    source: str = "measurements",
    bench: Bench | None = None,
    keep: Collection[str] = (),
) -> Fit:
    """Fit the constants of a process to measurements of cells.

    Parameters
    ----------
    measured : Measurements
    cells : sequence of Cell
        All cells that the measurements name.
    netlist : Path
        The file that holds them.
    process : Process
        Where the fit starts; it says what the transistors are called and how widths are written.
        What was not measured stays as it is there.
    source : str
        What the measurements are called in reports.
    bench : Bench, optional
        Where the cells were measured; None: as the file draws them.
    keep : collection of str
        Constants, by their keys in the process file, that stay as the process has them.

    Raises
    ------
    FitError
        Where too little was measured.
    EvenstageError
        Where the cells cannot be recognised.
    """
    bench = bench or build_bench(netlist, cells, process)
    graphs = arc_graphs(bench, measured.queries)
    known = np.array([graph is not None for graph in graphs], bool)[measured.query]
    rows = measured.only(known)
    types = _types(bench)
    width = float(np.median(bench.circuit.devices.width))
    every = unknowns_of(bench.circuit.process, types, width)
    unknowns = tuple(unknown for unknown in every if unknown.key not in keep)
    solution = Problem(bench, graphs, rows, unknowns).solved()
    inside = rows.only(solution.window.holds(rows))
    predictor = build_predictor(bench, graphs, inside)
    found = errors(predictor(solution.process), inside, solution.window)
    table = _Table(inside, predictor.stages, found.delay, found.output_transition)
    measurable = is_measured(solution.jacobian)
    free = measurable & ~at_bound(unknowns, solution.at)
    names = [_name(unknown, solution.process) for unknown in unknowns]
    notices = [notice for notice in process.notices if notice.code != GENERIC_NOTICE]
    notices += _left_out(measured, known)
    if not solution.settled:
        notices.append(_unsettled())
    return Fit(
        source=source,
        cells=str(netlist),
        process=_finished(solution.process, process, bench, source),
        constants=_constants(solution, unknowns, (measurable, free), bench),
        single=table.over(predictor.stages == 1, "one stage"),
        several=table.over(predictor.stages > 1, "several stages"),
        gates=table.by_gate(),
        confusions=find_confusions(solution.jacobian, solution.variance, free, names),
        measured=len(measured),
        used=len(inside),
        transition_least=solution.window.least,
        transition_most=solution.window.most,
        fo4=yardstick(solution.process).fo4,
        notices=tuple(notices),
    )


class _Table:
    """Residuals row by row, summed up on request."""

    def __init__(
        self,
        rows: Measurements,
        stages: IntArray,
        delay: FloatArray,
        transition: FloatArray,
    ) -> None:
        self._rows, self._stages = rows, stages
        self._delay, self._transition = delay, transition

    def over(self, chosen: BoolArray, name: str) -> Residuals | None:
        """Sum up some rows; None where there are none."""
        if not chosen.any():
            return None
        size = np.abs(self._delay[chosen])
        leaving = chosen & ~np.isnan(self._rows.output_transition)
        return Residuals(
            name=name,
            stages=int(self._stages[chosen].max()),
            count=int(chosen.sum()),
            bias=float(self._delay[chosen].mean()),
            median=float(np.median(size)),
            high=float(np.quantile(size, _HIGH)),
            transition=float(np.median(np.abs(self._transition[leaving])))
            if leaving.any()
            else None,
        )

    def by_gate(self) -> tuple[Residuals, ...]:
        """Sum up each gate, in the order measured."""
        names = [query.subcircuit for query in self._rows.queries]
        number = {name: index for index, name in enumerate(dict.fromkeys(names))}
        of_row = np.array([number[name] for name in names])[self._rows.query]
        every = (self.over(of_row == index, name) for name, index in number.items())
        return tuple(one for one in every if one is not None)


def _types(bench: Bench) -> tuple[int, ...]:
    """Return the transistor types that occur on a bench."""
    devices = bench.circuit.devices
    return tuple(sorted({devices.models[model].type_index for model in devices.model.tolist()}))


def _models(bench: Bench, index: int) -> tuple[str, ...]:
    """Return the model names of a type as the cells write them."""
    devices = bench.circuit.devices
    met = (devices.models[model] for model in sorted(set(devices.model.tolist())))
    return tuple(dict.fromkeys(model.name for model in met if model.type_index == index))


def _finished(fitted: Process, given: Process, bench: Bench, source: str) -> Process:
    """Return the fitted process as it is written: a given one keeps its names and other types.

    One that was inferred keeps the types met, under the model names met.
    """
    if given.origin == "file":
        return replace(fitted, unit_width=given.unit_width, unit_ratio=given.unit_ratio)
    met = tuple(
        replace(fitted.transistors[index], models=tuple(map(Pattern, _models(bench, index))))
        for index in _types(bench)
    )
    return replace(
        fitted,
        name=f"fitted to {source}",
        transistors=met,
        unit_width=None,
        unit_ratio=None,
        origin="file",
        notices=(),
    )


def _name(unknown: Unknown, process: Process) -> tuple[str, str]:
    kinds = dict.fromkeys(process.transistors[index].polarity for index in unknown.types)
    return "".join(kinds), unknown.key


def _constants(
    solution: Solution,
    unknowns: Sequence[Unknown],
    known: tuple[BoolArray, BoolArray],
    bench: Bench,
) -> tuple[FittedConstant, ...]:
    measurable, free = known
    spread = standard_errors(solution.jacobian, solution.variance, free)
    found = []
    for row, unknown in enumerate(unknowns):
        at = float(solution.at[row])
        told = "measured" if free[row] else "at its bound" if measurable[row] else "not measured"
        polarity, key = _name(unknown, solution.process)
        models = (name for index in unknown.types for name in _models(bench, index))
        error = unknown.error(at, float(spread[row]))
        found.append(
            FittedConstant(
                models=" ".join(models),
                polarity=polarity,
                key=key,
                value=getattr(solution.process.transistors[unknown.types[0]], unknown.key),
                error=error if free[row] and np.isfinite(error) else None,
                told=told,
            )
        )
    return tuple(found)


def _left_out(measured: Measurements, known: BoolArray) -> list[Notice]:
    """Name the arcs that no path leads along."""
    lost = np.unique(measured.query[~known]).tolist()
    if not lost:
        return []
    names = tuple(
        f"{q.subcircuit} {q.input} -> {q.output} {'rise' if q.rising else 'fall'}"
        for q in (measured.queries[index] for index in lost)
    )
    message = (
        f"{len(names)} measured arcs left out: no path of recognised gates leads along them, "
        f"the first is {names[0]}"
    )
    return [Notice("arc-left-out", message, names=names)]


def _unsettled() -> Notice:
    return Notice(
        "window-unsettled",
        "the transitions that count depend on the fit and did not come to rest: measurements at "
        "more transitions would help",
    )
