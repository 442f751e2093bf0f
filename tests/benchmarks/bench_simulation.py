"""How near estimate and simulation are, and how long simulations take, by hand.

Run ``PYTHONPATH=src:tests python tests/benchmarks/bench_simulation.py [SAMPLE ...]``. For every
sample: its process is fitted to simulated inverters, NAND2s and NOR2s alone; then its three slowest
paths, before and after resizing, are estimated and simulated on those constants. A chain of 20
stages with three gates beside each, and one of 200 nodes to 2,000 steps, measure speed.
"""

from __future__ import annotations

import sys
import tempfile
import time
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from evenstage import flow
from evenstage.process.read import read_process
from evenstage.simulation.integrate import Accuracy, integrate
from evenstage.simulation.ramps import switching
from evenstage.simulation.simulate import simulate
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, plain_process
from support.cells import cells
from support.nonlinear import Bench

if TYPE_CHECKING:
    from evenstage.simulation.results import SimulatedBlock

_SAMPLES = Path(__file__).parents[2] / "sample_netlists"


def line(name: str, some: SimulatedBlock) -> str:
    """Return estimate, simulation and difference of each path of a block."""
    paths = [*some.paths, *([some.other_edge] if some.other_edge else [])]
    texts = [
        f"{1e12 * p.estimated_delay:7.1f}/{1e12 * p.delay:6.1f}"
        f" {100 * (p.estimated_delay / p.delay - 1):+5.1f} %"
        for p in paths
    ]
    return f"  {name:6}  {'  '.join(texts)}  ranks {'alike' if some.ranks_alike else 'differ'}\n"


def sample(folder: Path, work: Path) -> str:
    """Return the lines of one sample."""
    drawn, fitted = work / f"{folder.name}_cells.sp", work / f"{folder.name}.toml"
    drawn.write_text(cells(read_process(folder / "process.toml")))
    question = flow.Question(process=folder / "process.toml")
    found = flow.fit_simulated(drawn, question, fitted)
    question = flow.Question(process=fitted, brief=folder / "brief.toml", count=3)
    netlist, after = folder / "netlist.sp", work / f"{folder.name}.sp"
    flow.resize(netlist, replace(question, count=1), output=after)
    begun = time.process_time()
    result = flow.simulate(netlist, question, after=after)
    seconds = time.process_time() - begun
    old, new = result.before, result.after
    assert new is not None
    assert found.single is not None
    claimed, simulated = (
        100 * (1 - later / earlier)
        for earlier, later in (
            (old.paths[0].estimated_delay, new.paths[0].estimated_delay),
            (old.paths[0].delay, new.paths[0].delay),
        )
    )
    return (
        f"{folder.name}: fit {100 * found.single.median:.1f} %, faster by {claimed:.1f} % claimed,"
        f" {simulated:.1f} % simulated; {seconds:.1f} s\n{line('before', old)}{line('after', new)}"
    )


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
    names = [f"n{i}" for i in range(200)]
    bench = Bench(names, ["0", "vdd", "in"])
    for entry, output in zip(["in", *names], names, strict=False):
        bench.inverter(entry, output)
    begun = time.process_time()
    waves = integrate(
        bench.equations(),
        switching(np.array([0.0, 1.0, 0.0]), np.array([0.0, 1.0, 1.0]), 0.0, 4.0),
        np.array([1.0, 0.0] * 100),
        (-1.0, 700.0),
        unit=1.0,
        supply=1.0,
        accuracy=Accuracy(relative=3e-5, absolute=3e-6),
    )
    second = time.process_time() - begun
    return (
        f"{len(path.stages)} stages, {path.side_gates} side gates, {path.nodes} nodes: "
        f"{first:.1f} s for both edges\n200 nodes, {len(waves.time)} steps: {second:.1f} s\n"
    )


def main() -> None:
    """Print the tables."""
    chosen = sys.argv[1:] or sorted(folder.name for folder in _SAMPLES.iterdir())
    with tempfile.TemporaryDirectory() as work:
        for name in chosen:
            sys.stdout.write(sample(_SAMPLES / name, Path(work)))
    sys.stdout.write(speed())


if __name__ == "__main__":
    main()
