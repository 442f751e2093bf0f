"""What holds an answer back, or makes a wish impossible, in a designer's words."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import InfeasibleError
from evenstage.sizing.limiting import limiting
from evenstage.units import engineering

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.sizing.engine import Engine
    from evenstage.sizing.infeasible import BudgetTooSmallError, LimitOutOfReachError
    from evenstage.sizing.joint import Corner
    from evenstage.sizing.problem import Problem
    from evenstage.sizing.solution import Solution

#: Relative room below which a limit counts as used up.
_FULL: Final = 1e-5


def limit_out_of_reach(engine: Engine, error: LimitOutOfReachError) -> InfeasibleError:
    """Say which input or which gate cannot keep its limit, and in which corner of several."""
    mine = (c for c in engine.corners if c.rows.start <= error.limit_row < c.rows.stop)
    corner = next(mine, None)
    if corner is None:
        return InfeasibleError(
            "a gate whose pull-up and pull-down are sized apart cannot keep its skew within the "
            "bounds of the brief and all other limits; set skew.least and skew.most farther apart",
            code="skew-out-of-reach",
        )
    limits, circuit = corner.limits, corner.model.circuit
    nets, own = limits.ceiling_net, error.limit_row - corner.rows.start
    where = f" in {circuit.process.name}" if len(engine.corners) > 1 else ""
    if own < len(nets):
        name = circuit.devices.net_names[nets[own]]
        ceiling = float(limits.ceiling[own])
        return InfeasibleError(
            f"input '{name}' may show {engineering(ceiling, 'F')}{where}, but the smallest widths "
            f"allowed there show {engineering(error.least * ceiling, 'F')}",
            code="input-over-ceiling",
        )
    row = corner.model.transition_row(limits)
    gate = int(circuit.arcs.gate[np.flatnonzero(row == own)[0]])
    limit = engineering(limits.transition, "s")
    return InfeasibleError(
        f"gate '{circuit.gate_name(gate)}' cannot keep the transition limit of {limit}{where}: "
        f"within the widths allowed its edges take {error.least:.3g} times as long",
        code="transition-out-of-reach",
    )


def budget_too_small(spend: str, error: BudgetTooSmallError) -> InfeasibleError:
    """Say what the smallest widths come to."""
    what, unit = ("total width", "m") if spend == "width" else ("capacitance", "F")
    return InfeasibleError(
        f"a {what} of {engineering(error.asked, unit, 4)} is out of reach: the smallest widths "
        f"allowed come to {engineering(error.least, unit, 4)}",
        code="budget-too-small",
    )


def blame(engine: Engine, problem: Problem, solution: Solution) -> str:
    """Say which limits hold the fastest answer back.

    Parameters
    ----------
    engine : Engine
    problem : Problem
        With all its limits, whatever the bounds.
    solution : Solution
        The fastest.
    """
    variables = engine.variables
    held_up, full = limiting(engine.joint, solution), used_up(problem, solution)
    inputs: list[str] = []
    edges, last = False, engine.corners[-1].rows.stop
    for corner in engine.corners:
        names, edge = _full(corner, held_up, full[corner.rows])
        inputs += names
        edges |= edge
    at_top = held_up & variables.free & (solution.sizes > variables.upper * (1 - 1e-6))
    stuck = int((held_up & ~variables.free).sum())
    held = []
    if len(inputs):
        held.append(f"the input capacitance allowed on '{inputs[0]}'")
    if edges:
        held.append("the transition limit")
    if full[last:].any():
        held.append("the skew allowed")
    if at_top.any():
        held.append(f"the largest widths allowed ({_sizes(int(at_top.sum()))})")
    if stuck:
        held.append(f"{_sizes(stuck)} on the limiting paths that may not change")
    if solution.spend_price > 0:
        held.append("the budget")
    return "it is held by " + (", ".join(held) or "the topology: no limit is active")


def _full(corner: Corner, held_up: BoolArray, full: BoolArray) -> tuple[list[str], bool]:
    """Return the full inputs of sizes that hold an answer up in a corner, and if edges are full."""
    limits, circuit = corner.limits, corner.model.circuit
    nets, row = limits.ceiling_net, corner.model.transition_row(limits)
    pins, of_gate = circuit.pins, corner.model.variables.partition.of_gate
    on_path = np.zeros(len(circuit.devices.net_names), bool)
    on_path[pins.net[held_up[of_gate[pins.gate]].any(axis=1)]] = True
    inputs = nets[full[: len(nets)] & on_path[nets]]
    arcs = held_up[of_gate[circuit.arcs.gate]].any(axis=1) & (row >= 0) & full[row]
    return [circuit.devices.net_names[net] for net in inputs.tolist()], bool(arcs.any())


def used_up(problem: Problem, solution: Solution) -> BoolArray:
    """Tell which limits a solution leaves no room, shape (limits,)."""
    used: BoolArray = problem.limit.sums(np.log(solution.sizes), problem.limits) > 1 - _FULL
    return used


def _sizes(number: int) -> str:
    return f"{number} size{'' if number == 1 else 's'}"
