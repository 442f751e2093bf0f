"""A netlist, a process and a brief, read, elaborated, recognised and analysed."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from evenstage.brief import Brief, read_brief
from evenstage.circuit.assumed import inferred, settled
from evenstage.circuit.recognise import in_process
from evenstage.circuit.recognise import recognise as find_gates
from evenstage.errors import SettingsError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read
from evenstage.netlist.rewriting.record import Record, find_record
from evenstage.process.read import read_process
from evenstage.sizing.named import refuse_unknown_names
from evenstage.timing.analyse import analyse as find_paths
from evenstage.timing.vectors import CONFLICTS

if TYPE_CHECKING:
    from collections.abc import Sequence
    from pathlib import Path

    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import Devices
    from evenstage.netlist.netlist import Netlist
    from evenstage.process.process import Process
    from evenstage.timing.results import Analysis


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
    circuit, brief, record = recognised(path, question, unit)
    analysis = find_paths(
        circuit, brief, start=question.start, end=question.end, count=question.count
    )
    return Block(circuit.devices.netlist, brief, circuit.process, analysis, record)


def in_corners(
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


def one_process(question: Question, command: str, instead: str = "give --process once") -> None:
    """Refuse further corners where a command knows only one, and say what to do instead.

    Raises
    ------
    SettingsError
        Where there are some.
    """
    if question.corners:
        raise SettingsError(
            f"{command} takes one process, got {1 + len(question.corners)}; {instead}",
            code="several-corners",
        )


def recognised(
    path: Path, question: Question, unit: Process | None = None
) -> tuple[Circuit, Brief, Record | None]:
    """Return the gates of a netlist, its brief, and what an earlier run recorded.

    Raises
    ------
    EvenstageError
        For every mistake in the inputs.
    """
    brief = read_brief(question.brief) if question.brief else Brief()
    netlist = read(path, brief.case, brief.first_line)
    given = read_process(question.process) if question.process else None
    devices = elaborate(netlist, question.top, given or inferred(netlist), brief)
    record = find_record(netlist.sources[0])
    process = _measured(given or settled(netlist, devices), devices, record, unit)
    circuit = find_gates(devices, process, brief)
    refuse_unknown_names(circuit, brief)
    return circuit, brief, record


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
