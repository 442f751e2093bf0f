"""A simulation as the document scripts read, and its waveforms as a table."""

from __future__ import annotations

import csv
import io
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Iterator

    from evenstage.report.circuit_document import Document
    from evenstage.simulation.results import (
        SimulatedBlock,
        SimulatedPath,
        SimulatedStage,
        Simulation,
    )


def simulation_body(simulation: Simulation) -> Document:
    """Return a simulation as plain values."""
    return {
        "side_branches": simulation.side_branches,
        "scaled_to_fo4": simulation.scaled,
        "speed_up": _speed_up(simulation),
        "before": _block(simulation.before),
        "after": None if simulation.after is None else _block(simulation.after),
    }


def _speed_up(simulation: Simulation) -> Document | None:
    if simulation.after is None:
        return None
    old, new = simulation.before.paths[0], simulation.after.paths[0]
    return {
        "estimated": old.estimated_delay / new.estimated_delay,
        "simulated": old.delay / new.delay,
    }


def _block(block: SimulatedBlock) -> Document:
    return {
        "source": block.analysis.source,
        "top": block.analysis.top,
        "ranks_alike": block.ranks_alike,
        "paths": [_path(path) for path in block.paths],
        "other_edge": None if block.other_edge is None else _path(block.other_edge),
        "same_path": None if block.same_path is None else _path(block.same_path),
    }


def _path(path: SimulatedPath) -> Document:
    estimate = path.estimate
    return {
        "from": estimate.start,
        "from_edge": estimate.start_edge,
        "to": estimate.end,
        "edge": estimate.edge,
        "estimated_delay_s": path.estimated_delay,
        "simulated_delay_s": path.delay,
        "devices": path.devices,
        "nodes": path.nodes,
        "time_steps": path.steps,
        "side_gates": path.side_gates,
        "held": [{"net": net, "level": int(level)} for net, level in path.held],
        "stages": [_stage(stage) for stage in path.stages],
    }


def _stage(stage: SimulatedStage) -> Document:
    estimate = stage.estimate
    return {
        "instance": estimate.instance,
        "function": estimate.function,
        "input": estimate.input,
        "output": estimate.output,
        "edge": estimate.edge,
        "estimated_delay_s": estimate.delay,
        "simulated_delay_s": stage.delay,
        "estimated_transition_s": estimate.transition,
        "simulated_transition_s": stage.transition,
    }


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
