"""How long sizing takes and how sure it is, beside what it must be: one table.

Run ``PYTHONPATH=src:tests python tests/benchmarks/bench_sizing.py [SUITE ...]`` on one thread, or
``pytest -m benchmark`` on this file. All seconds are CPU time of the optimiser alone, netlist
reading and compilation excluded; every answer's gap is confirmed by the independent checker.

``fastest``   open circuits of growing size, one node per gate, to a gap of 0.1 % of the delay
``cheapest``  at 1.1 times the least delay, to a gap of 0.1 % of the width, up to 12,000 gates
``million``   the largest of them eight times side by side, loads and parasitic delays off by up to
              5 %, in a process of its own: time, peak memory of the process, growth of the work
``edges``     the same circuits with a rising and a falling edge per gate, ties and input ceilings;
              invented layers of transistors through the real model, slopes and transition limits
              included (layers mesh more densely than circuits people draw)
``general``   a general convex solver on the same questions: as a user would write them, and by
              hand in log space
``large``     the same by hand from 50,000 gates on (takes a quarter of an hour)
``matrix``    the robustness matrix: circuits, bounds, wires, loads and drivers, all three questions

Circuits come from the package `circuitgraph`; see `support.open_circuits`. Without suites all but
``large`` are run.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
import time
import warnings
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
import pytest

from evenstage.errors import EvenstageError
from evenstage.netlist.reading.read import read_bytes
from evenstage.process.generic import generic
from evenstage.sizing.certificate import check
from evenstage.sizing.cooling import solve
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from support.large_netlists import layered
from support.open_circuits import Setting, circuit_problem, two_edges
from support.real_programmes import whole_block

if TYPE_CHECKING:
    from collections.abc import Iterator

    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import FloatArray, Problem
    from evenstage.sizing.solution import Solution

_GAP = 1e-3
#: Circuit, and the most seconds for the fastest.
_FASTEST = (
    ("c880", 0.1), ("c1908", 0.1), ("c3540", 0.1), ("c6288", 1.2), ("c7552", 1.2), ("adder", 1.2),
    ("sin", 1.2), ("sqrt", 12.0), ("b18_Cg", 12.0), ("multiplier", 12.0), ("b19_Cg", 12.0),
    ("memctrl", 12.0), ("div", 12.0),
)  # fmt: skip
_CHEAPEST = ("c880", "c1908", "c3540", "c6288", "c7552", "adder", "sin")
_GENERAL = ("c880", "c1908", "c3540", "c6288", "c7552", "adder")
_LARGE = ("square", "memctrl")
_MATRIX = (
    "c17", "c432", "c880", "c1908", "c3540", "c7552",
    "max", "adder", "c6288", "bar", "sin", "int2float",
)  # fmt: skip
_SETTINGS = (
    Setting(), Setting(upper=16), Setting(upper=1000), Setting(lower=0.3), Setting(wire=0),
    Setting(wire=5), Setting(outside=4), Setting(outside=400), Setting(driver=1),
    Setting(driver=100),
)  # fmt: skip
_ROUNDS_UP_TO = 20_000
_MILLION = ("b19_Cg", 8)


class Row(NamedTuple):
    """One line: what was measured, the value, what it must be, and more about it.

    A positive limit is the most it may be, a negative one the least, 0 is none.
    """

    what: str
    value: float
    unit: str
    limit: float
    note: str = ""

    def __str__(self) -> str:
        sign = "<=" if self.limit > 0 else ">="
        must = f"{sign} {abs(self.limit):g}" if self.limit else ""
        kept = "" if self.is_kept else "missed"
        return f"{self.what:<50}{self.value:9.3f} {self.unit:<5}{must:<9}{kept:<7}{self.note}"

    @property
    def is_kept(self) -> bool:
        """Whether the value is within its limit."""
        if not self.limit:
            return True
        return self.value <= self.limit if self.limit > 0 else self.value >= -self.limit


class Timed(NamedTuple):
    """A confirmed answer and its CPU seconds."""

    answer: Solution
    seconds: float


def timed(
    problem: Problem, goal: Goal, start: FloatArray, rounds: int = 1, gap: float = _GAP
) -> Timed:
    """Return the confirmed answer, and its CPU seconds, best of some rounds."""
    best = np.inf
    for _ in range(rounds):
        begun = time.process_time()
        answer = solve(problem, goal, start=start, tolerance=gap)
        best = min(best, time.process_time() - begun)
    assert check(problem, goal, answer).gap <= gap * (1 + 1e-6)
    return Timed(answer, best)


def middling(problem: Problem) -> FloatArray:
    """Return sizes to begin with: small ones, or the smallest where inputs have ceilings."""
    if problem.limits:
        return np.minimum(1.05 * problem.lower, problem.upper)
    found: FloatArray = np.clip(np.full(len(problem.lower), 4.0), problem.lower, problem.upper)
    return found


def rounds_for(problem: Problem) -> int:
    """Return how often a problem is timed."""
    return 5 if len(problem.lower) <= _ROUNDS_UP_TO else 1


def about(problem: Problem, found: Timed) -> str:
    """Return a note on how an answer was found."""
    gates = len(problem.lower)
    each = 1e6 * found.seconds / gates
    return f"{gates:,} gates, {each:.1f} us each, gap {found.answer.gap:.1e}"


def fastest() -> Iterator[Row]:
    """Yield the rows of the fastest sizes."""
    for name, most in _FASTEST:
        problem = circuit_problem(name)
        found = timed(problem, Fastest(), middling(problem), rounds_for(problem))
        yield Row(f"fastest, {name}", found.seconds, "s", most, about(problem, found))


def cheapest() -> Iterator[Row]:
    """Yield the rows of the cheapest sizes at 1.1 times the least delay."""
    for name in _CHEAPEST:
        problem = circuit_problem(name)
        least = timed(problem, Fastest(), middling(problem)).answer
        found = timed(problem, Cheapest(1.1 * least.delay), least.sizes, rounds_for(problem))
        yield Row(f"cheapest at 1.1, {name}", found.seconds, "s", 2.0, about(problem, found))


def million() -> Iterator[Row]:
    """Yield the rows of about a million gates, and how the work grew since a thousand."""
    paths = {**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)}
    command = [sys.executable, __file__, "measure"]
    done = subprocess.run(command, check=True, capture_output=True, env=paths)
    found = json.loads(done.stdout)
    note = f"{found['gates']:,.0f} gates, gap {found['gap']:.1e}"
    name = f"{_MILLION[0]} x {_MILLION[1]}"
    yield Row(f"fastest, {name}", found["seconds"], "s", 150.0, note)
    above = found["peak"] - found["empty"]
    note = f"interpreter and libraries, {found['empty'] / 1024:.0f} MB, apart"
    yield Row("peak memory with the problem, per gate", above / found["gates"], "KB", 1.0, note)
    small = circuit_problem("c3540")
    seconds = timed(small, Fastest(), middling(small), rounds_for(small)).seconds
    growth = found["seconds"] / found["gates"] / (seconds / len(small.lower))
    yield Row("work per gate, over that of c3540", growth, "x", 4.0)


def memory(kind: str) -> int:
    """Return the memory this process has (``VmRSS``) or had at most (``VmHWM``), KB."""
    status = Path("/proc/self/status").read_text("ascii").splitlines()
    return int(next(line for line in status if kind in line).split()[1])


def measure() -> None:
    """Size the largest block and print time and memory, KB."""
    name, copies = _MILLION
    empty = memory("VmRSS")
    problem = circuit_problem(name, copies=copies, spread=0.05)
    found = timed(problem, Fastest(), middling(problem))
    some = {"seconds": found.seconds, "gap": found.answer.gap, "peak": memory("VmHWM")}
    some["empty"] = empty
    sys.stdout.write(json.dumps({**some, "gates": len(problem.lower)}))


def edges() -> Iterator[Row]:
    """Yield circuits with two edges per gate, ties and ceilings: three times the limits of one."""
    for name, most in (("c3540", 0.3), ("c7552", 3.6), ("sin", 3.6), ("b18_Cg", 36.0)):
        problem = two_edges(circuit_problem(name))
        found = timed(problem, Fastest(), middling(problem), rounds_for(problem))
        yield Row(
            f"two edges, ties, ceilings, {name}", found.seconds, "s", most, about(problem, found)
        )
    for gates, most in ((1000, 0.3), (12_000, 0.0)):
        netlist = read_bytes(layered(gates, 40), "layers.sp", Path())
        engine = whole_block(netlist, generic(1.0))
        free = engine.model.variables
        problem = engine.problem(free.lower, free.upper)
        found = timed(problem, Fastest(), np.ones(len(free)), 3)
        note = f"{about(problem, found)}, {problem.limits:,} limits"
        yield Row(f"transistors in layers, real model, {gates:,}", found.seconds, "s", most, note)


def general() -> Iterator[Row]:
    """Yield ratios to a general convex solver on the same questions, to a gap of 0.01 %."""
    from support.convex_reference import reference_objective  # noqa: PLC0415 -- not for all suites
    from support.geometric_reference import least_delay  # noqa: PLC0415 -- likewise

    for name in _GENERAL:
        problem = circuit_problem(name)
        found = timed(problem, Fastest(), middling(problem), 5, 1e-4)
        begun = time.process_time()
        value, note = _tried(lambda problem=problem: reference_objective(problem, Fastest()))
        ratio = (time.process_time() - begun) / found.seconds
        note = f"{note or _beside(value, found.answer)}; ours {found.seconds:.3f} s"
        yield Row(f"by hand in log space over ours, {name}", ratio, "x", -6.0, note)
        if name in {"c880", "c1908", "c3540"}:
            begun = time.process_time()
            value, note = _tried(lambda problem=problem: least_delay(problem)[0])
            ratio = (time.process_time() - begun) / found.seconds
            note = note or _beside(value, found.answer)
            yield Row(f"gp=True over ours, {name}", ratio, "x", -150.0, note)


def large() -> Iterator[Row]:
    """Yield ratios to the convex solver by hand in log space on large circuits."""
    from support.convex_reference import reference_objective  # noqa: PLC0415 -- not for all suites

    for name in _LARGE:
        problem = circuit_problem(name)
        found = timed(problem, Fastest(), middling(problem))
        begun = time.process_time()
        value, note = _tried(lambda problem=problem: reference_objective(problem, Fastest()))
        ratio = (time.process_time() - begun) / found.seconds
        note = f"{note or _beside(value, found.answer)}; ours {found.seconds:.2f} s"
        yield Row(f"by hand in log space over ours, {name}", ratio, "x", -60.0, note)


def _tried(question: object) -> tuple[float, str]:
    """Return what a general solver found, or what ended it."""
    assert callable(question)
    with warnings.catch_warnings(record=True) as told:
        warnings.simplefilter("always")
        try:
            value = float(question())
        except Exception as error:  # noqa: BLE001 -- whatever ends it is the result
            return np.nan, type(error).__name__
    inaccurate = any("inaccurate" in str(one.message) for one in told)
    return value, f"{value:.6g}, inaccurate" if inaccurate else ""


def _beside(value: float, answer: Solution) -> str:
    """Return how a value lies to our answer and its bound."""
    return f"theirs {value:.6g}, ours {answer.delay:.6g} >= {answer.bound:.6g}"


def matrix() -> Iterator[Row]:
    """Yield how many questions of the robustness matrix are answered and certified, in per cent."""
    asked: dict[str, int] = {}
    kept: dict[str, int] = {}
    slowest = 0.0
    for name in _MATRIX:
        for setting in _SETTINGS:
            for kind, goal, start, problem in questions(name, setting):
                asked[kind] = asked.get(kind, 0) + 1
                try:
                    slowest = max(slowest, timed(problem, goal, start).seconds)
                except (AssertionError, EvenstageError) as error:
                    sys.stderr.write(f"{name} {setting} {goal}: {error}\n")
                else:
                    kept[kind] = kept.get(kind, 0) + 1
    for kind, count in asked.items():
        share = 100.0 * kept.get(kind, 0) / count
        yield Row(f"certified to 0.1 %, {kind}", share, "%", -100.0, f"of {count} questions")
    yield Row("slowest of these", slowest, "s", 0.0)


def questions(name: str, setting: Setting) -> Iterator[tuple[str, Goal, FloatArray, Problem]]:
    """Yield the questions about a circuit in a setting."""
    problem = circuit_problem(name, setting)
    start = np.full(len(problem.lower), 4.0)
    least = solve(problem, Fastest(), start=start, tolerance=_GAP)
    smallest = problem.cost(problem.lower)
    yield "fastest", Fastest(), start, problem
    for factor in (1.02, 1.1, 1.4):
        goal = Cheapest(factor * least.delay)
        yield f"cheapest at {factor}", goal, least.sizes, problem
    for factor in (1.1, 1.5, 3.0):
        yield f"budget of {factor}", Budget(factor * smallest), start, problem


_SUITES = {
    "fastest": fastest,
    "cheapest": cheapest,
    "million": million,
    "edges": edges,
    "general": general,
    "matrix": matrix,
    "large": large,
}


def warm() -> None:
    """Load the compiled loops, and compile them where that has not been done."""
    problem = circuit_problem("c7552")
    least = timed(problem, Fastest(), middling(problem)).answer
    timed(problem, Cheapest(1.2 * least.delay), least.sizes)


@pytest.mark.benchmark
@pytest.mark.parametrize("suite", [name for name in _SUITES if name != "large"])
def test_all_is_within_its_limits(suite: str) -> None:
    warm()
    rows = list(_SUITES[suite]())
    sys.stdout.writelines(f"\n{row}" for row in rows)
    assert [row.what for row in rows if not row.is_kept] == []


def main() -> None:
    """Print the rows of the suites asked for."""
    warm()
    if sys.argv[1:] == ["measure"]:
        measure()
        return
    for name in sys.argv[1:] or [some for some in _SUITES if some != "large"]:
        for row in _SUITES[name]():
            sys.stdout.write(f"{row}\n")
            sys.stdout.flush()


if __name__ == "__main__":
    main()
