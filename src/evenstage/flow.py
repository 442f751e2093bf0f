"""What each command does: the rooms in order, once."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Literal

import numpy as np

from evenstage.brief import Brief, read_brief
from evenstage.circuit.inventory import Inventory, take_inventory
from evenstage.circuit.recognise import in_process
from evenstage.circuit.recognise import recognise as find_gates
from evenstage.errors import EvenstageError, OutputError, SettingsError
from evenstage.fitting.cells import leaf_cells, measured_cells, standing_alone
from evenstage.fitting.deck import Deck, measuring_deck
from evenstage.fitting.fit import fit as fit_process
from evenstage.fitting.reading import read_measurements, read_results
from evenstage.fitting.results import Fit
from evenstage.fitting.sized import sized_bench
from evenstage.fitting.tabulate import tabulate
from evenstage.logic.same import StructureCheck, compare_structure
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read
from evenstage.netlist.rewriting.edits import rewrite
from evenstage.netlist.rewriting.output import (
    check_place,
    lost_includes,
    output_files,
    write_files,
)
from evenstage.netlist.rewriting.record import Record, digest, find_record, record_edit
from evenstage.process.generic import at_length
from evenstage.process.infer import infer_process
from evenstage.process.read import read_process
from evenstage.process.write import process_text
from evenstage.progress import tell
from evenstage.report.graph_document import graph_document
from evenstage.report.page import render
from evenstage.report.page.origin import FileDigest, Origin
from evenstage.report.published import schema_text
from evenstage.report.results import Result, json, notices, text
from evenstage.report.simulation_document import waveform_table
from evenstage.simulation.measure import measure_gates
from evenstage.simulation.parameters import assumption_notices
from evenstage.simulation.results import Simulation
from evenstage.simulation.simulate import simulate as run_simulation
from evenstage.simulation.strength import with_currents
from evenstage.sizing.named import refuse_unknown_names
from evenstage.sizing.resize import resize as find_widths
from evenstage.sizing.results import Sizing
from evenstage.sizing.trade_off import trade_off
from evenstage.sizing.wishes import Original, Wishes
from evenstage.timing.analyse import analyse as find_paths
from evenstage.timing.compare import compare
from evenstage.timing.corners import Corners, CornersDifference, merged
from evenstage.timing.results import Analysis, Difference
from evenstage.timing.vectors import CONFLICTS, false_path_notices, with_vectors
from evenstage.timing.yardstick import yardstick

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence
    from pathlib import Path

    from evenstage.circuit.circuit import Circuit
    from evenstage.errors import Notice
    from evenstage.netlist.devices import Devices
    from evenstage.netlist.netlist import Netlist
    from evenstage.process.process import Process
    from evenstage.report.page.render import Reviewable
    from evenstage.simulation.results import SideBranches

__all__ = [
    "Analysis",
    "Block",
    "Corners",
    "CornersDifference",
    "Deck",
    "Difference",
    "Fit",
    "Inventory",
    "Origin",
    "Question",
    "Result",
    "Simulation",
    "Sizing",
    "Wishes",
    "analyse",
    "check_place",
    "diff",
    "fit",
    "fit_simulated",
    "html",
    "json",
    "load",
    "notices",
    "origin",
    "recognise",
    "resize",
    "schema_text",
    "simulate",
    "text",
    "write_deck",
    "write_text",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class Question:
    """What every command is told.

    Parameters
    ----------
    process, brief : Path, optional
        Their files.
    corners : tuple of Path
        Files of further processes.
    top : str, optional
        The subcircuit to work on.
    start, end : str, optional
        Nets that paths must start from or end at.
    count : int
        How many slowest paths are wanted.
    conflicts : int
        After so many the search for the vector of one path is given up; 0: no search.
    """

    process: Path | None = None
    brief: Path | None = None
    corners: tuple[Path, ...] = ()
    top: str | None = None
    start: str | None = None
    end: str | None = None
    count: int = 1
    conflicts: int = CONFLICTS


@dataclass(frozen=True, slots=True)
class Block:
    """A netlist read, elaborated and analysed; the record where an earlier run wrote it."""

    netlist: Netlist
    brief: Brief
    process: Process
    analysis: Analysis
    record: Record | None


def load(path: Path, question: Question, unit: Process | None = None) -> Block:
    """Read, elaborate, recognise and analyse a netlist.

    Parameters
    ----------
    path : Path
        The main file.
    question : Question
        What else is told.
    unit : Process, optional
        Whose unit inverter counts where the process names none; None: that of the netlist as
        first drawn.

    Raises
    ------
    EvenstageError
        For every mistake in the inputs.
    """
    circuit, brief, record = _recognised(path, question, unit)
    analysis = find_paths(
        circuit, brief, start=question.start, end=question.end, count=question.count
    )
    return Block(circuit.devices.netlist, brief, circuit.process, analysis, record)


def _in_corners(
    path: Path, question: Question, units: Sequence[Process | None] = ()
) -> tuple[Block, ...]:
    """Return the block in each corner asked for, the netlist laid out once where that serves all.

    Raises
    ------
    EvenstageError
        As `load`.
    """
    first = load(path, question, units[0] if units else None)
    blocks = [first]
    for index, corner in enumerate(question.corners, 1):
        process, unit = read_process(corner), units[index] if units else None
        timing = first.analysis.timing
        if timing is None or process.drawing != first.process.drawing:
            blocks.append(load(path, replace(question, process=corner, corners=()), unit))
            continue
        process = _measured(process, timing.circuit.devices, first.record, unit)
        circuit = in_process(timing.circuit, process, first.brief)
        analysis = find_paths(
            circuit, first.brief, start=question.start, end=question.end, count=question.count
        )
        blocks.append(replace(first, process=circuit.process, analysis=analysis))
    return tuple(blocks)


def _one_process(question: Question, command: str) -> None:
    """Refuse further corners where a command knows only one.

    Raises
    ------
    SettingsError
        Where there are some.
    """
    if question.corners:
        raise SettingsError(
            f"{command} takes one process, got {1 + len(question.corners)}; give --process once",
            code="several-corners",
        )


def _recognised(
    path: Path, question: Question, unit: Process | None = None
) -> tuple[Circuit, Brief, Record | None]:
    brief = read_brief(question.brief) if question.brief else Brief()
    netlist = read(path, brief.case)
    given = read_process(question.process) if question.process else None
    devices = elaborate(netlist, question.top, given or _inferred(netlist), brief)
    record = find_record(netlist.sources[0])
    process = _measured(given or _settled(netlist, devices), devices, record, unit)
    circuit = find_gates(devices, process, brief)
    refuse_unknown_names(circuit, brief)
    return circuit, brief, record


def recognise(path: Path, question: Question, graph: Path | None = None) -> Inventory:
    """Find out what each group of transistors is, and write the graph of gates where asked for.

    Raises
    ------
    EvenstageError
        For every mistake in the inputs.
    OutputError
        Where the graph cannot be written.
    """
    _one_process(question, "recognise")
    circuit, _, _ = _recognised(path, question)
    if graph is not None:
        write_text(graph, graph_document(circuit), force=True)
    return take_inventory(circuit)


def analyse(path: Path, question: Question) -> Analysis | Corners:
    """Find the slowest paths of a netlist, over all corners asked for; raises as `load`."""
    blocks = _in_corners(path, question)
    # In several corners each path stands once, with its worst: false ones stay and say so.
    analyses = [
        with_vectors(block.analysis, question.conflicts, replacing=not question.corners)
        for block in blocks
    ]
    return merged(analyses) if question.corners else analyses[0]


def diff(before: Path, after: Path, question: Question) -> Difference | CornersDifference:
    """Compare two netlists of one design, in all corners asked for; raises as `load`."""
    first = _in_corners(before, question)
    second = _in_corners(after, question, [block.process for block in first])
    old, new = ([block.analysis for block in blocks] for blocks in (first, second))
    differences = tuple(map(compare, old, new))
    if not question.corners:
        return differences[0]
    return CornersDifference(before=merged(old), after=merged(new), differences=differences)


def simulate(
    path: Path,
    question: Question,
    *,
    after: Path | None = None,
    side_branches: SideBranches = "gates",
    waveforms: Path | None = None,
) -> Simulation:
    """Simulate the slowest paths of a netlist, and of the same design after a change.

    Parameters
    ----------
    path : Path
    question : Question
    after : Path, optional
        The changed netlist.
    side_branches : {"gates", "capacitances"}
        How what hangs on the paths is simulated.
    waveforms : Path, optional
        Where the voltages are written as CSV.

    Raises
    ------
    EvenstageError
        For every mistake in the inputs, and where no path can be simulated.
    OutputError
        Where the waveforms cannot be written.
    """
    _one_process(question, "simulate")
    first = load(path, question)
    second = None if after is None else load(after, question, first.process).analysis
    result = run_simulation(first.analysis, second, side_branches=side_branches)
    if waveforms is not None:
        write_text(waveforms, waveform_table(result), force=True)
    return result


def resize(
    path: Path,
    question: Question,
    wishes: Wishes | None = None,
    output: Path | None = None,
    *,
    force: bool = False,
    curve: bool = False,
    spend: Literal["width", "energy"] | None = None,
) -> Sizing:
    """Find new widths and, where an output is named, write the netlist with them.

    With ``curve`` the least spend for a dozen delays is found too. ``spend`` says what is kept
    small; default: what the brief says.

    Raises
    ------
    EvenstageError
        For every mistake in the inputs and every wish that cannot be met.
    OutputError
        Where the output exists (without ``force``) or cannot be written.
    """
    _one_process(question, "resize")
    _refuse_existing(output, force=force)
    block = load(path, question)
    wishes = _with_aims(wishes or Wishes(), block.brief)
    wishes = replace(wishes, spend=spend or wishes.spend)
    record = block.record
    asked = _asked(question, wishes)
    original = _original(record, wishes.spend)
    if record is not None and record.key == digest(block.netlist, asked):
        sizing = _already_done(block, record, wishes)
    else:
        sizing = find_widths(block.analysis, block.brief, wishes, original)
    told = false_path_notices(block.analysis)
    sizing = replace(sizing, notices=(*sizing.notices, *told))
    if curve:
        curved = trade_off(block.analysis, block.brief, wishes, original)
        sizing = replace(sizing, trade_off=curved)
    if output is None:
        return sizing
    texts = _texts(block, sizing, record, asked)
    write_files(output_files(block.netlist, texts, output), force=force)
    tell(f"checking '{output}', which is written")
    lost = lost_includes(block.netlist, output)
    structure = _read_back(block, output, lost) if texts else None
    return replace(sizing, notices=(*sizing.notices, *lost), structure=structure)


def _read_back(block: Block, output: Path, lost: Sequence[Notice]) -> StructureCheck:
    """Read a written netlist and compare it with the one it was made of.

    Raises
    ------
    RuntimeError
        Where it cannot be read, or differs in more than widths: a fault of ours.
    """
    assert block.analysis.timing is not None
    before = block.analysis.timing.circuit.devices
    if lost:
        reason = "it includes files that are not found from its place"
        return StructureCheck(same=None, reason=reason, transistors=0)
    try:
        written = read(output, block.brief.case)
        after = elaborate(written, before.top or None, block.process, block.brief)
        check = compare_structure(before, after)
        reason = check.reason
    except EvenstageError as error:
        reason = str(error)
    if reason:
        raise RuntimeError(f"do not use '{output}': it is not the netlist it was made of: {reason}")
    return check


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
    _one_process(question, "fit")
    _refuse_existing(output, force=force)
    told = read_results(results) if results else None
    measured, netlist = read_measurements(measurements, told), read(cells)
    brief = read_brief(question.brief) if question.brief else Brief()
    given = read_process(question.process) if question.process else None
    found = measured_cells(measured, netlist, given or _inferred(netlist), brief)
    first = elaborate(netlist, found[0].name, given or _inferred(netlist), brief)
    begin = given or _settled(netlist, first)
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
    _one_process(question, "fit")
    _refuse_existing(output, force=force)
    netlist = read(cells)
    brief = read_brief(question.brief) if question.brief else Brief()
    given = read_process(question.process) if question.process else None
    found = leaf_cells(netlist, given or _inferred(netlist), brief)
    first = elaborate(netlist, found[0].name, given or _inferred(netlist), brief)
    begin = given or _settled(netlist, first)
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
    result = fit_process(measured, found, cells, start, source=source, bench=bench)
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
    _one_process(question, "fit")
    table = deck.with_suffix(".csv")
    if table == deck:
        message = f"'{deck}' is the table's name; give the deck another ending, such as .sp"
        raise OutputError(message, code="output-exists")
    for path in (deck, table):
        check_place(path, [cells])
    netlist = read(cells)
    brief = read_brief(question.brief) if question.brief else Brief()
    given = read_process(question.process) if question.process else None
    found = standing_alone(netlist, given or _inferred(netlist), brief)
    first = elaborate(netlist, found[0].name, given or _inferred(netlist), brief)
    result = measuring_deck(found, cells, given or _settled(netlist, first))
    texts = {deck: result.text, table: result.table}
    files = {path: text.encode("utf-8", "surrogateescape") for path, text in texts.items()}
    write_files(files, force=force)
    return replace(result, output=deck, table_output=table)


def _with_output(result: Fit, output: Path, *, force: bool) -> Fit:
    """Write the process file of a fit."""
    write_text(output, process_text(result.process, result.head), force=force)
    return replace(result, output=output)


def _refuse_existing(output: Path | None, *, force: bool) -> None:
    """Refuse at once what could not be written in the end.

    Raises
    ------
    OutputError
        Where the output exists.
    """
    if output is not None and output.exists() and not force:
        raise OutputError(
            f"'{output}' exists; choose another name, or say --force to overwrite it",
            code="output-exists",
        )


def origin(
    version: str, arguments: Sequence[str], files: Iterable[Path], delay: float | None = None
) -> Origin:
    """Return where a result comes from, with the digests of the files that are there.

    Parameters
    ----------
    version : str
    arguments : sequence of str
        Of the command line.
    files : iterable of Path
        Read or written.
    delay : float, optional
        s, asked for.
    """
    named = dict.fromkeys(files)
    digests = tuple(
        FileDigest(str(path), hashlib.sha256(path.read_bytes()).hexdigest())
        for path in named
        if path.is_file()
    )
    return Origin(version, tuple(arguments), digests, delay)


def html(result: Reviewable, origin: Origin) -> str:
    """Return a result as one self-contained page."""
    return render.html(result, origin)


def write_text(path: Path, content: str, *, force: bool) -> None:
    """Write a report as a file, whole or not at all.

    Raises
    ------
    OutputError
        Where it exists (without ``force``) or cannot be written.
    """
    write_files({path: content.encode("utf-8", "surrogateescape")}, force=force)


def _inferred(
    netlist: Netlist, supply: float | None = None, length: float | None = None
) -> Process:
    facts = [(card.name, card.kind, card.values) for card in netlist.models.values()]
    return infer_process(facts, supply, length)


def _settled(netlist: Netlist, devices: Devices) -> Process:
    """Return the inferred process, now that supply and channel length are known."""
    volts = [abs(value) for _, _, value in devices.source_nets if value]
    length = float(np.median(devices.length)) if len(devices) else None
    process = _inferred(netlist, max(volts, default=None), length)
    return at_length(process, length) if process.origin == "generic" and length else process


def _measured(
    process: Process, devices: Devices, record: Record | None, unit: Process | None
) -> Process:
    """Return a process that keeps its unit inverter while the widths of a netlist change.

    Where the process names none, it is as wide as the smallest nMOS: measured anew after each
    sizing, tau and the loads of bare outputs would move with the widths.
    """
    if process.unit_width is not None:
        return process
    if unit is not None:
        return replace(process, unit_width=unit.unit_width)
    if record is None:
        return process
    n_models = {model.name.lower() for model in devices.models if model.polarity == "n"}
    widths = [width for name, width in record.smallest.items() if name in n_models]
    return replace(process, unit_width=min(widths, default=None))


def _with_aims(wishes: Wishes, brief: Brief) -> Wishes:
    """Take the aims of the brief where the command line has none.

    Raises
    ------
    SettingsError
        Where the brief aims at a delay and at a width.
    """
    wishes = replace(wishes, spend=brief.aim_spend)
    if wishes.delay is None and wishes.width is None:
        if brief.aim_delay is not None and brief.aim_width is not None:
            raise SettingsError(
                "the brief aims at a delay and at a width; keep one of aim.delay and aim.width",
                code="two-aims",
            )
        return replace(wishes, delay=brief.aim_delay, width=brief.aim_width)
    return wishes


def _asked(question: Question, wishes: Wishes) -> str:
    """Return all that decides an answer besides the netlist, as text."""
    files = [path.read_bytes().hex() if path else "" for path in (question.process, question.brief)]
    return repr((wishes, question.top, question.start, question.end, files))


def _original(record: Record | None, spend: str) -> Original:
    """Return the limits an earlier run recorded."""
    if record is None:
        return Original()
    return Original(
        ceilings=record.ceilings,
        transition=record.transition,
        smallest=record.smallest,
        spend=record.total_width if spend == "width" else record.switched_cap,
    )


def _texts(block: Block, sizing: Sizing, record: Record | None, asked: str) -> dict[Path, bytes]:
    """Return the files that change, the record at the head of the first among them."""
    if not sizing.edits:
        return {}
    key = digest(block.netlist, asked, rewrite(block.netlist, sizing.edits))
    head = record_edit(block.netlist, _record(sizing, record, key))
    return rewrite(block.netlist, (head, *sizing.edits))


def _record(sizing: Sizing, earlier: Record | None, key: str) -> Record:
    """Return what later runs are told; what was first drawn stays what it was."""
    before, kept = sizing.before, sizing.kept or Original()
    first = earlier or before
    return Record(
        key=key,
        delay_before=earlier.delay_before if earlier else before.paths[0].delay,
        delay_after=sizing.after.paths[0].delay,
        least_delay=sizing.least_delay,
        total_width=first.total_width,
        switched_cap=first.switched_cap,
        transition=kept.transition or before.worst_transition,
        bound=sizing.bound,
        bound_on=sizing.bound_on,
        gap=sizing.gap,
        rounding_loss=sizing.rounding_loss,
        ceilings=kept.ceilings,
        smallest=kept.smallest,
    )


def _already_done(block: Block, record: Record, wishes: Wishes) -> Sizing:
    """Return the sizing of a netlist that an earlier run wrote with the same wishes."""
    analysis = block.analysis
    return Sizing(
        before=analysis,
        after=analysis,
        goal=wishes.words,
        bound=record.bound,
        bound_on=record.bound_on,
        gap=record.gap,
        rounding_loss=record.rounding_loss,
        least_delay=record.least_delay,
        total_width_before=analysis.total_width,
        total_width_after=analysis.total_width,
        free_cards=0,
        fixed_cards=0,
        changes=(),
        holds=(),
        already_done=True,
        notices=(),
    )
