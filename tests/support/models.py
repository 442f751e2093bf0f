"""From netlist text to a model of its sizes."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from evenstage.circuit.recognise import in_process
from evenstage.netlist.rewriting.handles import width_handles
from evenstage.sizing.joint import Joint
from evenstage.sizing.model import Model
from evenstage.sizing.partition import partition
from evenstage.sizing.pulls import pulled_apart, skews
from evenstage.sizing.variables import variables
from evenstage.timing.analyse import time
from support.blocks import circuit_of

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.rewriting.handles import WidthHandles
    from evenstage.process.process import Process
    from evenstage.sizing.partition import Partition
    from evenstage.sizing.problem import Problem
    from evenstage.sizing.variables import Variables

SKEW = (0.5, 2.0)
"""Bounds of a gate's skew where its sides are apart."""


def handles_of(circuit: Circuit, parts: Partition, copies: int = 4) -> WidthHandles:
    """Return how the widths of a partition can be changed."""
    return width_handles(circuit.devices, circuit.process, parts.variable_of, copies)


def variables_of(
    circuit: Circuit,
    brief: Brief | None = None,
    smallest: Mapping[str, float] | None = None,
    *,
    apart: bool = False,
) -> Variables:
    """Return the sizes of a circuit with their bounds; ``apart``: of pull-ups and pull-downs."""
    parts = partition(circuit, brief)
    if apart:
        parts, _ = pulled_apart([circuit], parts)
    free = variables(circuit, brief, parts, handles_of(circuit, parts), smallest)
    return replace(free, skews=skews(circuit, parts, *SKEW)) if apart else free


def model_of(
    text: str, process: Process | None = None, brief: Brief | None = None, *, apart: bool = False
) -> Model:
    """Return the model of a netlist's sizes."""
    circuit = circuit_of(text, process, brief)
    timing = time(circuit, brief)
    return Model(circuit, timing.graph, timing.unit, variables_of(circuit, brief, apart=apart))


def in_corners(
    text: str, processes: Sequence[Process], brief: Brief | None = None, *, apart: bool = False
) -> Joint:
    """Return the models of a netlist's sizes in several processes."""
    circuit = circuit_of(text, processes[0], brief)
    free = variables_of(circuit, brief, apart=apart)
    timings = [time(in_process(circuit, process, brief), brief) for process in processes]
    return Joint(tuple(Model(one.circuit, one.graph, one.unit, free) for one in timings))


def in_picoseconds(problem: Problem) -> Problem:
    """Return the same question with numbers that a general solver's tolerances suit."""
    return replace(
        problem,
        start_arrival=problem.start_arrival * 1e12,
        delay=replace(problem.delay, coefficient=problem.delay.coefficient * 1e12),
        end_offset=problem.end_offset * 1e12,
    )
