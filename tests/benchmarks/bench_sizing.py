"""How long exact sizing takes, by hand.

Run ``PYTHONPATH=src:tests python tests/benchmarks/bench_sizing.py [GATES ...]``. Invented blocks of
100 to 5,000 gates with a rising and a falling edge each, in 40 layers. ``near`` wires each gate to
neighbours, as in real blocks; ``any`` wires each layer to the one before at random. Per goal:
seconds, factorisations, and the gap the independent checker confirms.
"""

from __future__ import annotations

import sys
import time
from typing import TYPE_CHECKING

import numpy as np

from evenstage.sizing.certificate import check
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.interior_point import solve
from support.problems import random_problem

if TYPE_CHECKING:
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import FloatArray, Problem
    from evenstage.sizing.solution import Solution

_GATES = (100, 300, 1000, 2000, 5000)
_HEAD = f"{'gates':>6} {'wired':>5} {'arcs':>7} {'monomials':>9}" + "".join(
    f"   {name:>9} {'steps':>5} {'gap':>7}" for name in ("fastest s", "at 1 % s", "budget s")
)


def timed(problem: Problem, goal: Goal, start: FloatArray) -> tuple[str, Solution]:
    """Return a table cell and the confirmed answer."""
    begun = time.perf_counter()
    answer = solve(problem, goal, start=start)
    seconds = time.perf_counter() - begun
    gap = check(problem, goal, answer).gap
    return f"   {seconds:9.2f} {answer.iterations:5d} {gap:7.0e}", answer


def row(gates: int, near: int | None) -> str:
    """Return one row of the table."""
    problem = random_problem(61, gates, depth=min(40, gates // 5), near=near)
    start = np.full(gates, 4.0)
    fastest, best = timed(problem, Fastest(), start)
    cheapest, cheap = timed(problem, Cheapest(1.01 * best.delay), best.sizes)
    least = problem.cost(problem.lower)
    within, _ = timed(problem, Budget(0.5 * (least + cheap.spend)), start)
    wired = "any" if near is None else "near"
    head = f"{gates:6d} {wired:>5} {len(problem.arc_source):7d} {len(problem.delay.row):9d}"
    return head + fastest + cheapest + within


def main() -> None:
    """Print the table."""
    sys.stdout.write(_HEAD + "\n")
    for gates in [int(text) for text in sys.argv[1:]] or _GATES:
        for near in (5, None):
            sys.stdout.write(row(gates, near) + "\n")
            sys.stdout.flush()


if __name__ == "__main__":
    main()
