"""How long sizing takes, by hand, beside what it must take.

Run ``PYTHONPATH=src:tests python tests/benchmarks/bench_sizing.py [SUITE ...]`` on one thread:

``table``     open circuits of growing size, one node per gate: the fastest, and the cheapest at 1.1
              times that, to a gap of 0.1 %; CPU seconds of the optimiser, Newton steps,
              microseconds per gate, the gap the independent checker confirms, peak memory
``million``   the largest of them eight times side by side, loads off by up to 5 %
``edges``     invented blocks with rising and falling edges and input ceilings
``convex``    a general convex solver on the same questions, by hand in log space
``matrix``    the robustness matrix: circuits, bounds, wires, loads and drivers, all three questions

Circuits come from the package `circuitgraph`; see `support.open_circuits`.
"""

from __future__ import annotations

import resource
import sys
import time
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import EvenstageError
from evenstage.sizing.certificate import check
from evenstage.sizing.cooling import solve
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from support.convex_reference import reference_objective
from support.open_circuits import Setting, circuit_problem
from support.problems import random_problem

if TYPE_CHECKING:
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import FloatArray, Problem
    from evenstage.sizing.solution import Solution

_GAP = 1e-3
#: Circuit, and the most seconds for the fastest.
_TABLE = (
    ("c880", 0.1), ("c1908", 0.1), ("c3540", 0.1), ("c6288", 1.2), ("c7552", 1.2), ("adder", 1.2),
    ("sin", 1.2), ("sqrt", 12.0), ("b18_Cg", 12.0), ("multiplier", 12.0), ("b19_Cg", 12.0),
    ("memctrl", 12.0), ("div", 12.0),
)  # fmt: skip
_CHEAPEST_UP_TO = 13_000
_MATRIX = (
    "c17", "c432", "c880", "c1908", "c3540", "c7552",
    "max", "adder", "c6288", "bar", "sin", "int2float",
)  # fmt: skip
_SETTINGS = (
    Setting(), Setting(upper=16), Setting(upper=1000), Setting(lower=0.3), Setting(wire=0),
    Setting(wire=5), Setting(outside=4), Setting(outside=400), Setting(driver=1),
    Setting(driver=100),
)  # fmt: skip


def timed(problem: Problem, goal: Goal, start: FloatArray) -> tuple[Solution, float]:
    """Return the confirmed answer and its CPU seconds."""
    begun = time.process_time()
    answer = solve(problem, goal, start=start, tolerance=_GAP)
    seconds = time.process_time() - begun
    assert check(problem, goal, answer).gap <= _GAP * (1 + 1e-6)
    return answer, seconds


def row(name: str, problem: Problem, most: float) -> None:
    """Print one circuit."""
    gates = len(problem.lower)
    start = np.clip(np.full(gates, 4.0), problem.lower, problem.upper)
    if problem.limits:
        start = 1.05 * problem.lower
    answer, seconds = timed(problem, Fastest(), start)
    each = 1e6 * seconds / gates
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / gates
    text = f"{name:12} {gates:8d} {seconds:8.2f} {most:6.1f} {answer.iterations:6d} {each:8.1f}"
    text += f" {answer.gap:8.1e} {peak:7.2f}"
    if gates <= _CHEAPEST_UP_TO:
        cheap, seconds = timed(problem, Cheapest(1.1 * answer.delay), answer.sizes)
        text += f" {seconds:8.2f} {cheap.iterations:6d} {cheap.gap:8.1e}"
    say(text)


def say(text: str) -> None:
    """Print a line at once."""
    sys.stdout.write(text + "\n")
    sys.stdout.flush()


def head() -> None:
    """Print what the columns are."""
    say(
        "circuit         gates  fastest   must  steps  us/gate      gap KB/gate"
        " cheapest  steps      gap"
    )


def table() -> None:
    """Print the table of open circuits."""
    head()
    for name, most in _TABLE:
        row(name, circuit_problem(name), most)


def million() -> None:
    """Print the row of about a million gates."""
    head()
    row("b19_Cg x 8", circuit_problem("b19_Cg", copies=8, spread=0.05), 150.0)


def edges() -> None:
    """Print blocks with two edges per gate."""
    head()
    for gates in (1000, 3000, 12_000):
        row("near", random_problem(61, gates, depth=40, near=5), 0.1 * 3 if gates == 1000 else 3.6)


def convex() -> None:
    """Print ratios to a general convex solver."""
    say("circuit         gates     ours   theirs  ratio")
    for name in ("c432", "c880", "c1908", "c3540", "c6288", "c7552", "adder"):
        problem = circuit_problem(name)
        _, ours = timed(problem, Fastest(), np.full(len(problem.lower), 4.0))
        begun, note = time.process_time(), ""
        try:
            reference_objective(problem, Fastest())
        except Exception as error:  # noqa: BLE001 -- whatever ends it is the result
            note = type(error).__name__
        theirs = time.process_time() - begun
        gates, ratio = len(problem.lower), theirs / ours
        say(f"{name:12} {gates:8d} {ours:8.3f} {theirs:8.2f} {ratio:6.0f} {note}")


def matrix() -> None:
    """Print how many questions of the robustness matrix are answered."""
    for name in _MATRIX:
        asked = answered = 0
        slowest = 0.0
        for setting in _SETTINGS:
            for goal, start, problem in _questions(name, setting):
                asked += 1
                try:
                    _, seconds = timed(problem, goal, start)
                except (AssertionError, EvenstageError) as error:
                    say(f"  {name} {setting} {goal}: {error}")
                else:
                    answered += 1
                    slowest = max(slowest, seconds)
        say(f"{name:12} {answered:4d} of {asked:4d}, slowest {slowest:.2f} s")


def _questions(name: str, setting: Setting) -> list[tuple[Goal, FloatArray, Problem]]:
    """Return the questions about a circuit in a setting."""
    problem = circuit_problem(name, setting)
    start = np.full(len(problem.lower), 4.0)
    fastest = solve(problem, Fastest(), start=start, tolerance=_GAP)
    least = problem.cost(problem.lower)
    goals: list[tuple[Goal, FloatArray, Problem]] = [(Fastest(), start, problem)]
    goals += [(Cheapest(f * fastest.delay), fastest.sizes, problem) for f in (1.02, 1.1, 1.4)]
    return goals + [(Budget(f * least), start, problem) for f in (1.1, 1.5, 3.0)]


_SUITES = {
    "table": table,
    "million": million,
    "edges": edges,
    "convex": convex,
    "matrix": matrix,
}


def main() -> None:
    """Run the suites that were asked for."""
    warm = circuit_problem("c7552")
    timed(warm, Fastest(), np.full(len(warm.lower), 4.0))
    for name in sys.argv[1:] or ("table", "edges"):
        _SUITES[name]()


if __name__ == "__main__":
    main()
