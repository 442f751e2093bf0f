"""Simulations as documents, and their waveforms as a table."""

from __future__ import annotations

import csv
import io
from typing import TYPE_CHECKING, Final, get_args

import numpy as np

from evenstage.errors import DocumentError
from evenstage.report.document.shape import (
    NUMBER,
    TEXT,
    TRUTH,
    WHOLE,
    Field,
    Kind,
    Shape,
    Told,
    a_list,
    many,
    optional,
    words,
)
from evenstage.report.document.timing import ANALYSIS, HELD, NOTICES, PATH, STAGE, YARDSTICK
from evenstage.simulation.results import (
    SideBranches,
    SimulatedBlock,
    SimulatedPath,
    SimulatedStage,
    Simulation,
    Traces,
)

if TYPE_CHECKING:
    from collections.abc import Iterator

    from evenstage.netlist.devices import FloatArray
    from evenstage.report.document.shape import Document, JsonValue


def _write_rows(rows: FloatArray) -> JsonValue:
    found: list[JsonValue] = rows.tolist()
    return found


def _read_row(value: object, place: str) -> FloatArray:
    return np.array([NUMBER.read(one, place) for one in a_list(value, place)], float)


def _read_rows(value: object, place: str) -> FloatArray:
    rows = [_read_row(one, f"{place}[{index}]") for index, one in enumerate(a_list(value, place))]
    if len({len(row) for row in rows}) > 1:
        raise DocumentError(f"the rows of '{place}' have different lengths", code="not-a-document")
    return np.array(rows, float)


_TRACES: Final = Shape(
    Traces,
    Field("nets", "nets", many(TEXT)),
    Field("time_s", "time", Kind(_write_rows, _read_row)),
    Field("voltage_v", "voltage", Kind(_write_rows, _read_rows)),
)


_STAGE: Final = Shape(
    SimulatedStage,
    Told("instance", lambda stage: stage.estimate.instance),
    Told("function", lambda stage: stage.estimate.function),
    Told("input", lambda stage: stage.estimate.input),
    Told("output", lambda stage: stage.estimate.output),
    Told("edge", lambda stage: stage.estimate.edge),
    Told("estimated_delay_s", lambda stage: stage.estimate.delay),
    Field("simulated_delay_s", "delay", NUMBER),
    Told("estimated_transition_s", lambda stage: stage.estimate.transition),
    Field("simulated_transition_s", "transition", optional(NUMBER)),
    Field("estimate", "estimate", STAGE.kind),
)

_PATH: Final = Shape(
    SimulatedPath,
    Told("from", lambda path: path.estimate.start),
    Told("from_edge", lambda path: path.estimate.start_edge),
    Told("to", lambda path: path.estimate.end),
    Told("edge", lambda path: path.estimate.edge),
    Told("estimated_delay_s", lambda path: path.estimated_delay),
    Field("simulated_delay_s", "delay", NUMBER),
    Field("devices", "devices", WHOLE),
    Field("nodes", "nodes", WHOLE),
    Field("time_steps", "steps", WHOLE),
    Field("side_gates", "side_gates", WHOLE),
    Field("held", "held", HELD),
    Field("held_by_vector", "by_vector", TRUTH),
    Field("stages", "stages", many(_STAGE.kind)),
    Field("estimate", "estimate", PATH.kind),
    Field("traces", "traces", _TRACES.kind),
)

_BLOCK: Final = Shape(
    SimulatedBlock,
    Told("source", lambda block: block.analysis.source),
    Told("top", lambda block: block.analysis.top),
    Told("ranks_alike", lambda block: block.ranks_alike),
    Field("paths", "paths", many(_PATH.kind)),
    Field("other_edge", "other_edge", optional(_PATH.kind)),
    Field("same_path", "same_path", optional(_PATH.kind)),
    Field("analysis", "analysis", ANALYSIS.kind),
)


def _speed_up(simulation: Simulation) -> Document | None:
    if simulation.after is None:
        return None
    old, new = simulation.before.paths[0], simulation.after.paths[0]
    return {
        "estimated": old.estimated_delay / new.estimated_delay,
        "simulated": old.delay / new.delay,
    }


SIMULATION: Final = Shape(
    Simulation,
    Told("process", lambda simulation: YARDSTICK.write(simulation.before.analysis.yardstick)),
    Field("side_branches", "side_branches", words(*get_args(SideBranches))),
    Field("scaled_to_fo4", "scaled", TRUTH),
    Told("speed_up", _speed_up),
    Field("before", "before", _BLOCK.kind),
    Field("after", "after", optional(_BLOCK.kind)),
    Field("notices", "notices", NOTICES),
)


def waveform_table(simulation: Simulation) -> str:
    """Return the waveforms of all simulated paths as CSV, one voltage a line.

    Columns: ``netlist``; ``path``, its number or what else it is; ``net``; ``time_s``, 0 where the
    input's ramp begins; ``voltage_v``.
    """
    text = io.StringIO()
    table = csv.writer(text, lineterminator="\n")
    table.writerow(["netlist", "path", "net", "time_s", "voltage_v"])
    for block in (simulation.before, simulation.after):
        if block is None:
            continue
        for label, path in _labelled(block):
            traces = path.traces
            for net, voltages in zip(traces.nets, traces.voltage.tolist(), strict=True):
                table.writerows(
                    [block.analysis.source, label, net, f"{time:.6e}", f"{voltage:.6g}"]
                    for time, voltage in zip(traces.time.tolist(), voltages, strict=True)
                )
    return text.getvalue()


def _labelled(block: SimulatedBlock) -> Iterator[tuple[str, SimulatedPath]]:
    for place, path in enumerate(block.paths, 1):
        yield str(place), path
    if block.other_edge is not None:
        yield "other edge", block.other_edge
    if block.same_path is not None:
        yield "slowest before", block.same_path
