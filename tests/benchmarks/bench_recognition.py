"""How long recognition takes from 10^4 to 10^6 transistors, and what memory.

Run ``PYTHONPATH=src:tests python tests/benchmarks/bench_recognition.py``, or ``pytest -m
benchmark`` on this file, which holds the tables against their limits. All blocks are invented here:
a hierarchy of 200 leaves, and a flat block. Each is measured in a process of its own, after
elaboration: recognition, pins, arcs and loads, with nothing known before, as a user meets it. CPU
seconds, best of three processes; memory is the peak beyond what elaboration left. Where nothing is
quadratic the microseconds per transistor do not grow.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
import tempfile
import time
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
import pytest

from evenstage.circuit.recognise import recognise
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read
from evenstage.process.generic import generic
from support.large_netlists import flat, hierarchical, layered

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from evenstage.circuit.circuit import Circuit

_ROUNDS = 3
#: Transistors, and how many blocks of the hierarchy make about so many.
_SIZES = {10_000: 4, 30_000: 11, 100_000: 38, 300_000: 114, 1_000_000: 380}
#: Most seconds for a million transistors, and most GiB.
_MOST = {"hierarchy": (3.0, 0.6), "flat": (10.0, 0.6)}
#: Most that a transistor of the largest block may take, over one of the smallest.
_GROWTH_MOST = 1.5


class Point(NamedTuple):
    """One block: transistors, CPU seconds, and the peak of the memory beyond elaboration, GiB."""

    kind: str
    devices: int
    seconds: float
    memory: float

    @property
    def each(self) -> float:
        """Microseconds per transistor."""
        return 1e6 * self.seconds / self.devices

    @property
    def is_kept(self) -> bool:
        """Whether a block of a million transistors is within its limits."""
        seconds, memory = _MOST[self.kind]
        whole = self.devices >= max(_SIZES)
        return not whole or (self.seconds <= seconds and self.memory <= memory)

    def __str__(self) -> str:
        seconds, memory = _MOST[self.kind]
        must = f"  must {seconds:g} s, {memory:g} GiB" if self.devices >= max(_SIZES) else ""
        missed = "" if self.is_kept else "  missed"
        return (
            f"{self.kind:<10}{self.devices:>10,}{self.seconds:9.2f} s{self.each:8.2f} us"
            f"{self.memory:8.3f} GiB{must}{missed}"
        )


def curve() -> Iterator[Point]:
    """Yield the points of both kinds of block, small ones first."""
    for kind in _MOST:
        for size, blocks in _SIZES.items():
            text = hierarchical(blocks) if kind == "hierarchy" else flat(size)
            with tempfile.NamedTemporaryFile(suffix=".sp") as file:
                file.write(text)
                file.flush()
                found = [_apart(file.name) for _ in range(_ROUNDS)]
            devices, seconds, memory = (min(one) for one in zip(*found, strict=True))
            yield Point(kind, int(devices), seconds, memory)


def growth(points: list[Point]) -> dict[str, float]:
    """Return for each kind what a transistor of the largest block takes over one of the smallest.

    Blocks of fewer than 100,000 are left out: there the few hundred distinct networks, each
    recognised once, weigh more than all their copies.
    """
    found = {}
    for kind in _MOST:
        each = [point.each for point in points if point.kind == kind and point.devices >= 90_000]
        found[kind] = each[-1] / each[0]
    return found


def vectors() -> Iterator[tuple[str, float, float]]:
    """Yield what was measured of `Circuit.evaluate`, CPU seconds, and what they must not exceed."""
    with tempfile.NamedTemporaryFile(suffix=".sp") as file:
        file.write(layered(29_700, 60))
        file.flush()
        circuit = _circuit(Path(file.name))
    inputs = [net for net in circuit.devices.ports if circuit.driver_of_net[net] < 0]
    for count, limit in ((64, 2.0), (1024, 20.0)):
        random = np.random.default_rng(11)
        given = {circuit.devices.net_names[net]: random.integers(0, 2, count) for net in inputs}
        what = f"{count} vectors x {len(circuit.devices):,} transistors"
        yield what, min(_seconds(partial(circuit.evaluate, given)) for _ in range(_ROUNDS)), limit


def _seconds(action: Callable[[], object]) -> float:
    begun = time.process_time()
    action()
    return time.process_time() - begun


def _circuit(path: Path) -> Circuit:
    process = generic(1.0)
    return recognise(elaborate(read(path), process=process), process)


def _apart(path: str) -> tuple[float, float, float]:
    """Measure a block in a process of its own."""
    paths = {**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)}
    command = [sys.executable, __file__, path]
    done = subprocess.run(command, check=True, capture_output=True, env=paths)
    devices, seconds, memory = json.loads(done.stdout)
    return devices, seconds, memory


def measure(path: Path) -> None:
    """Recognise a block and print its transistors, CPU seconds and GiB."""
    process = generic(1.0)
    devices = elaborate(read(path), process=process)
    # From here on the system counts the peak anew.
    Path("/proc/self/clear_refs").write_text("5", "ascii")
    before = _memory("VmRSS")
    begun = time.process_time()
    circuit = recognise(devices, process)
    arcs, loads = circuit.arcs, circuit.net_cap
    seconds = time.process_time() - begun
    assert len(arcs)
    assert len(loads)
    sys.stdout.write(json.dumps([len(devices), seconds, _memory("VmHWM") - before]))


def _memory(key: str) -> float:
    """Return what the system says of this process's memory, GiB."""
    status = Path("/proc/self/status").read_text("ascii")
    return int(next(line for line in status.splitlines() if key in line).split()[1]) / 2**20


@pytest.mark.benchmark
@pytest.mark.skipif(not Path("/proc/self/clear_refs").exists(), reason="memory is asked of Linux")
def test_all_is_within_its_limits() -> None:
    points = list(curve())
    assert [str(point) for point in points if not point.is_kept] == []
    assert max(growth(points).values()) <= _GROWTH_MOST
    assert [what for what, seconds, limit in vectors() if seconds > limit] == []


def main() -> None:
    """Print the tables, or measure one block."""
    if len(sys.argv) > 1:
        measure(Path(sys.argv[1]))
        return
    points = []
    for point in curve():
        points.append(point)
        sys.stdout.write(f"{point}\n")
        sys.stdout.flush()
    for kind, factor in growth(points).items():
        text = f"{kind}: a transistor of the largest block over one of 100,000"
        sys.stdout.write(f"{text:<62}{factor:6.2f}  must {_GROWTH_MOST:g}\n")
    for what, seconds, limit in vectors():
        sys.stdout.write(f"{what:<62}{seconds:6.2f} s  must {limit:g} s\n")


if __name__ == "__main__":
    main()
