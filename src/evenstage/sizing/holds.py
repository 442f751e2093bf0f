"""What holds each stage of a path at its size."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.sizing.results import StageHold
from evenstage.timing.search import slowest_paths

if TYPE_CHECKING:
    from evenstage.netlist.devices import IntArray
    from evenstage.sizing.engine import Continuous, Engine
    from evenstage.sizing.joint import Corner
    from evenstage.sizing.results import Hold
    from evenstage.sizing.timed import Timed

_AT_BOUND = 1e-4
"""Relative distance to a bound below which a size counts as held by it."""


def stage_holds(engine: Engine, answer: Continuous, block: Timed) -> tuple[StageHold, ...]:
    """Return one hold per stage of the slowest path over all corners after the resizing."""
    after = block.corners[block.limiting]
    circuit, graph = after.circuit, after.graph
    found = [int(graph.arc[arc]) for arc in next(slowest_paths(after))]
    return tuple(
        StageHold(
            instance=circuit.gate_name(int(circuit.arcs.gate[arc])),
            hold=_hold(
                engine,
                answer,
                int(circuit.arcs.gate[arc]),
                rising=bool(circuit.arcs.rising[arc]),
            ),
        )
        for arc in found
    )


def _hold(engine: Engine, answer: Continuous, gate: int, *, rising: bool) -> Hold:
    """Return what holds the side of a gate that makes an edge."""
    size = int(engine.variables.partition.of_gate[gate, int(rising)])
    if not answer.active[size]:
        return "fixed"
    if answer.sizes[size] < answer.lower[size] * (1 + _AT_BOUND):
        return "lower"
    if answer.sizes[size] > answer.upper[size] * (1 - _AT_BOUND):
        return "upper"
    if _on_full_input(engine, answer, gate):
        return "ceiling"
    if _is_skewed(engine, answer, size):
        return "skew"
    return "transition" if _makes_slowest_edge(engine, answer, gate) else ""


def _on_full_input(engine: Engine, answer: Continuous, gate: int) -> bool:
    """Tell whether a gate loads an input whose ceiling is used up."""
    pins = engine.model.circuit.pins
    mine = pins.net[pins.gate == gate]
    return any(bool(np.isin(mine, _full_inputs(corner, answer)).any()) for corner in engine.corners)


def _full_inputs(corner: Corner, answer: Continuous) -> IntArray:
    nets = corner.limits.ceiling_net
    return nets[answer.full[corner.rows][: len(nets)]]


def _is_skewed(engine: Engine, answer: Continuous, size: int) -> bool:
    """Tell whether a size is as far from that of its gate's other side as it may be."""
    skews = engine.variables.skews
    if skews is None:
        return False
    full = answer.full[engine.corners[-1].rows.stop :].reshape(2, -1).any(axis=0)
    return bool((full & ((skews.up == size) | (skews.down == size))).any())


def _makes_slowest_edge(engine: Engine, answer: Continuous, gate: int) -> bool:
    """Tell whether the transition limit of one of a gate's arcs is used up."""
    mine = engine.model.circuit.arcs.gate == gate
    for corner, limits in zip(engine.corners, answer.limits, strict=True):
        row = corner.model.transition_row(limits)
        if answer.full[corner.rows][row[mine & (row >= 0)]].any():
            return True
    return False
