"""What holds each stage of a path at its size."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.sizing.results import StageHold
from evenstage.timing.search import slowest_paths

if TYPE_CHECKING:
    from evenstage.sizing.engine import Continuous, Engine
    from evenstage.sizing.results import Hold
    from evenstage.timing.sweep import Timing

_AT_BOUND = 1e-4
"""Relative distance to a bound below which a size counts as held by it."""


def stage_holds(engine: Engine, answer: Continuous, after: Timing) -> tuple[StageHold, ...]:
    """Return one hold per stage of the slowest path after the resizing."""
    circuit, graph = after.circuit, after.graph
    gates = [int(circuit.arcs.gate[graph.arc[arc]]) for arc in next(slowest_paths(after))]
    return tuple(
        StageHold(instance=circuit.gate_name(gate), hold=_hold(engine, answer, gate))
        for gate in gates
    )


def _hold(engine: Engine, answer: Continuous, gate: int) -> Hold:
    size = int(engine.model.variables.partition.of_gate[gate])
    if not answer.active[size]:
        return "fixed"
    if answer.sizes[size] < answer.lower[size] * (1 + _AT_BOUND):
        return "lower"
    if answer.sizes[size] > answer.upper[size] * (1 - _AT_BOUND):
        return "upper"
    if _on_full_input(engine, answer, gate):
        return "ceiling"
    return "transition" if _makes_slowest_edge(engine, answer, gate) else ""


def _on_full_input(engine: Engine, answer: Continuous, gate: int) -> bool:
    """Tell whether a gate loads an input whose ceiling is used up."""
    nets, pins = engine.limits.ceiling_net, engine.model.circuit.pins
    full = nets[answer.full[: len(nets)]]
    return bool(np.isin(pins.net[pins.gate == gate], full).any())


def _makes_slowest_edge(engine: Engine, answer: Continuous, gate: int) -> bool:
    """Tell whether the transition limit of one of a gate's arcs is used up."""
    row = engine.model.transition_row(answer.limits)
    mine = row[(engine.model.circuit.arcs.gate == gate) & (row >= 0)]
    return bool(answer.full[mine].any())
