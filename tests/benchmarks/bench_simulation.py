"""How near estimate and simulation are, stage by stage, and how long simulations take, by hand.

Run ``PYTHONPATH=src:tests python tests/benchmarks/bench_simulation.py [SAMPLE ...]``. For every
sample: its process is fitted to simulated inverters, NAND2s and NOR2s alone; then its three slowest
paths, before and after resizing, are estimated and simulated on those constants. A chain of 20
stages with three gates beside each, and chains of 100 to 400 nodes to some 2,000 steps, measure
speed.
"""

from __future__ import annotations

import sys
import tempfile
import time
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from evenstage.simulation.integrate import Accuracy, integrate
from evenstage.simulation.ramps import switching
from evenstage.simulation.simulate import simulate
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, plain_process
from support.nonlinear import Bench
from support.sample_simulation import SAMPLES, simulated

if TYPE_CHECKING:
    from evenstage.simulation.results import SimulatedBlock, SimulatedPath
    from support.sample_simulation import Simulated


def off(path: SimulatedPath) -> str:
    """Return estimate, simulation and difference of a path."""
    error = 100 * (path.estimated_delay / path.delay - 1)
    return f"{1e12 * path.estimated_delay:6.1f} {1e12 * path.delay:6.1f} {error:+5.1f} %"


def rows(when: str, some: SimulatedBlock) -> str:
    """Return a line for each path of a block, and one for the stages of the first."""
    named = [(str(place), path) for place, path in enumerate(some.paths, 1)]
    if some.other_edge is not None:
        named.append(("other edge", some.other_edge))
    lines = [f"  {when:6} {name:10} {off(path)}" for name, path in named]
    stages = [
        f"{stage.estimate.function} {100 * (stage.estimate.delay / stage.delay - 1):+.0f}"
        for stage in some.paths[0].stages
    ]
    lines.insert(1, f"         stages of 1, %: {', '.join(stages)}")
    return "\n".join(lines)


def sample(found: Simulated) -> str:
    """Return the lines of one sample."""
    claimed, gained = (100 * gain for gain in found.gains)
    turned = [f"{w} {i} and {j} ({100 * by:.2f} % apart)" for w, i, j, by, _ in found.turned]
    head = (
        f"{found.name}: fit {100 * found.fitted:.1f} %, faster by {claimed:.1f} % claimed,"
        f" {gained:.1f} % simulated; ranked differently: {', '.join(turned) or 'none'};"
        f" {found.seconds:.1f} s for {len(found.paths)} paths"
    )
    return "\n".join([head, *(rows(when, some) for when, some in found.blocks.items()), ""])


def speed() -> str:
    """Return how long long chains take."""
    cards = [
        inverter(f"{name}{i}", f"s{i}", f"s{i + 1}" if name == "a" else f"t{name}{i}", 1.0, 2.0)
        for i in range(20)
        for name in "abcd"
    ]
    analysis = analyse(circuit_of(block("\n".join(cards), "s0"), plain_process(slope=0.2)))
    begun = time.process_time()
    path = simulate(analysis).before.paths[0]
    first = time.process_time() - begun
    head = (
        f"{len(path.stages)} stages, {path.side_gates} side gates, {path.nodes} nodes:"
        f" {first:.1f} s for both edges"
    )
    taken = {size: chain(size) for size in (100, 200, 400)}
    base = taken[200][1] / taken[200][0]
    lines = [
        f"{size} nodes, {2 * size} transistors, {steps} steps: {seconds:.1f} s;"
        f" a step takes {seconds / steps / base:.2f} times that of 200 nodes"
        for size, (steps, seconds) in taken.items()
    ]
    return "\n".join([head, *lines, ""])


def chain(size: int) -> tuple[int, float]:
    """Return steps and seconds of a chain of inverters, an edge running through half of it."""
    names = [f"n{i}" for i in range(size)]
    bench = Bench(names, ["0", "vdd", "in"])
    for entry, output in zip(["in", *names], names, strict=False):
        bench.inverter(entry, output)
    begun = time.process_time()
    waves = integrate(
        bench.equations(),
        switching(np.array([0.0, 1.0, 0.0]), np.array([0.0, 1.0, 1.0]), 0.0, 4.0),
        np.array([1.0, 0.0] * (size // 2)),
        (-1.0, 700.0),
        unit=1.0,
        supply=1.0,
        accuracy=Accuracy(relative=4e-6, absolute=4e-7),
    )
    return len(waves.time), time.process_time() - begun


def main() -> None:
    """Print the tables."""
    chosen = sys.argv[1:] or sorted(folder.name for folder in SAMPLES.iterdir())
    with tempfile.TemporaryDirectory() as work:
        for name in chosen:
            sys.stdout.write(sample(simulated(name, Path(work))))
            sys.stdout.flush()
    sys.stdout.write(speed())


if __name__ == "__main__":
    main()
