"""A process from delays, measured or simulated, and the deck that measures them."""

from __future__ import annotations

from dataclasses import replace
from functools import partial
from typing import TYPE_CHECKING, Final

from evenstage.brief import Brief, read_brief
from evenstage.circuit.assumed import inferred, settled
from evenstage.errors import OutputError
from evenstage.fitting.cells import leaf_cells, measured_cells, standing_alone
from evenstage.fitting.deck import measuring_deck
from evenstage.fitting.fit import fit as fit_process
from evenstage.fitting.reading import read_measurements, read_results
from evenstage.fitting.sized import sized_bench
from evenstage.fitting.tabulate import tabulate
from evenstage.flow.files import refuse_existing, write_text
from evenstage.flow.loading import Question, one_process
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read
from evenstage.netlist.rewriting.output import check_place, write_files
from evenstage.process.read import read_process
from evenstage.process.write import process_text
from evenstage.simulation.measure import measure_gates
from evenstage.simulation.parameters import assumption_notices
from evenstage.simulation.strength import with_currents
from evenstage.timing.yardstick import yardstick

if TYPE_CHECKING:
    from collections.abc import Callable
    from pathlib import Path

    from evenstage.fitting.bench import Cell
    from evenstage.fitting.results import Deck, Fit
    from evenstage.netlist.netlist import Netlist
    from evenstage.process.process import Process

#: A simulation counts shared drains as the process says: there is nothing to find.
_AS_SIMULATED: Final = ("drain_shared", "drain_inner")


def fit(
    measurements: Path,
    cells: Path,
    question: Question,
    output: Path | None = None,
    *,
    results: Path | None = None,
    force: bool = False,
) -> Fit:
    """Fit a process to measured delays and, where an output is named, write it as a process file.

    Raises
    ------
    EvenstageError
        For every mistake in the inputs, and where too little was measured.
    OutputError
        Where the output exists (without ``force``) or cannot be written.
    """
    one_process(question, "fit")
    refuse_existing(output, force=force)
    told = read_results(results) if results else None
    measured = read_measurements(measurements, told)
    found, begin = _cells(cells, question, partial(measured_cells, measured))
    result = fit_process(measured, found, cells, begin, source=str(measurements))
    return result if output is None else _with_output(result, output, force=force)


def fit_simulated(
    cells: Path, question: Question, output: Path | None = None, *, force: bool = False
) -> Fit:
    """Fit a process to the simulated delays of all cells of a netlist that are one gate each.

    The process then says its currents too, so that simulations with it are those it was fitted to.

    Raises
    ------
    EvenstageError
        For every mistake in the inputs, and where no cell can be simulated.
    OutputError
        Where the output exists (without ``force``) or cannot be written.
    """
    one_process(question, "fit")
    refuse_existing(output, force=force)
    found, begin = _cells(cells, question, leaf_cells)
    bench = sized_bench(cells, found, begin)
    unit = yardstick(bench.circuit.process)
    exact = with_currents(bench.circuit.process, unit)
    bench = replace(bench, circuit=replace(bench.circuit, process=exact))
    delays = measure_gates(bench.circuit, unit, range(len(bench.circuit)))
    measured = tabulate(
        bench,
        (delays.input, delays.output, delays.rising),
        (delays.transition, delays.load),
        (delays.delay, delays.output_transition, delays.input_cap),
    )
    start = replace(begin, transistors=exact.transistors)
    source = f"simulated delays of {cells}"
    result = fit_process(
        measured, found, cells, start, source=source, bench=bench, keep=_AS_SIMULATED
    )
    said = (*result.notices, *assumption_notices(begin), *delays.notices)
    result = replace(result, notices=tuple(dict.fromkeys(said)))
    return result if output is None else _with_output(result, output, force=force)


def write_deck(deck: Path, cells: Path, question: Question, *, force: bool = False) -> Deck:
    """Write a measuring deck for the cells of a netlist, and beside it the table it fills.

    Raises
    ------
    EvenstageError
        For every mistake in the inputs.
    OutputError
        Where one of the files exists (without ``force``) or cannot be written.
    """
    one_process(question, "fit")
    table = deck.with_suffix(".csv")
    if table == deck:
        message = f"'{deck}' is the table's name; give the deck another ending, such as .sp"
        raise OutputError(message, code="output-exists")
    for path in (deck, table):
        check_place(path, [cells])
    found, process = _cells(cells, question, standing_alone)
    result = measuring_deck(found, cells, process)
    texts = {deck: result.text, table: result.table}
    files = {path: text.encode("utf-8", "surrogateescape") for path, text in texts.items()}
    write_files(files, force=force)
    return replace(result, output=deck, table_output=table)


def _cells(
    path: Path, question: Question, choose: Callable[[Netlist, Process, Brief], tuple[Cell, ...]]
) -> tuple[tuple[Cell, ...], Process]:
    """Return the cells chosen from a netlist, and the process to begin with."""
    brief = read_brief(question.brief) if question.brief else Brief()
    netlist = read(path, brief.case, brief.first_line)
    given = read_process(question.process) if question.process else None
    found = choose(netlist, given or inferred(netlist), brief)
    first = elaborate(netlist, found[0].name, given or inferred(netlist), brief)
    return found, given or settled(netlist, first)


def _with_output(result: Fit, output: Path, *, force: bool) -> Fit:
    """Write the process file of a fit."""
    write_text(output, process_text(result.process, result.head), force=force)
    return replace(result, output=output)
