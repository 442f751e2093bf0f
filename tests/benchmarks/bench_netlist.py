"""How fast netlists are read, laid out and rewritten, and what memory that takes.

Run ``PYTHONPATH=src:tests python tests/benchmarks/bench_netlist.py``, or ``pytest -m benchmark`` on
this file, which holds the table against its limits. All texts are invented here. Times are CPU
seconds, best of three; ``ref`` is splitting the same bytes into lines and each line into words, in
the same run. The large blocks are measured in processes of their own, for their peak memory.
"""

from __future__ import annotations

import json
import os
import resource
import subprocess
import sys
import tempfile
import time
import tracemalloc
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

import pytest

from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.grammar import ENCODING, parser
from evenstage.netlist.reading.read import read, read_bytes
from evenstage.netlist.rewriting.edits import EditColumns, rewrite
from support.large_netlists import extracted, flat, hierarchical

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from evenstage.netlist.netlist import Netlist

_ROUNDS = 3
_MILLION = 1_000_000


class Row(NamedTuple):
    """One line of the table: what was measured, the value, and what it must not exceed."""

    what: str
    value: float
    unit: str
    limit: float

    def __str__(self) -> str:
        sign = "<=" if self.limit > 0 else ">="
        kept = "" if self.is_kept else "  missed"
        number = f"{self.value:10.2f} {self.unit:<8}"
        return f"{self.what:<58}{number}{sign} {abs(self.limit):g}{kept}"

    @property
    def is_kept(self) -> bool:
        """Whether the value is within its limit; a negative limit is a least value."""
        return self.value <= self.limit if self.limit > 0 else self.value >= -self.limit


def seconds(action: Callable[[], object]) -> float:
    """Return the CPU time of something, best of three."""
    best = float("inf")
    for _ in range(_ROUNDS):
        begun = time.process_time()
        action()
        best = min(best, time.process_time() - begun)
    return best


def words(data: bytes) -> None:
    """Split a text into lines and each line into words, as the measure of all others."""
    for line in data.split(b"\n"):
        line.split()


def read_text(data: bytes) -> Netlist:
    return read_bytes(data, "block.sp", Path())


def reading() -> Iterator[Row]:
    """Yield how long reading takes, relative to splitting into words and to Lark alone."""
    parser("netlist")  # a quarter of a second, once for all
    texts = {
        "flat, repeated sizes": (flat(300_000), 11.0),
        "flat, unique sizes": (flat(300_000, unique=True), 11.0),
        "extracted": (extracted(350_000), 15.0),
        "hierarchical, with expressions": (hierarchical(380), 13.0),
    }
    for name, (data, limit) in texts.items():
        ratio = seconds(partial(read_text, data)) / seconds(partial(words, data))
        yield Row(f"reading, {name}", ratio, "x ref", limit)
    data = flat(10_000)
    text = data.decode(ENCODING)
    by_lark = seconds(lambda: parser("netlist").parse(text, start="netlist")) / len(data)
    data = texts["flat, repeated sizes"][0]
    rate = seconds(partial(read_text, data)) / len(data)
    yield Row("the grammar alone, over reading flat text", by_lark / rate, "x", -20.0)


def layout() -> Iterator[Row]:
    """Yield what large blocks take from text to devices, each measured in its own process."""
    texts = {
        "flat": (flat(_MILLION), 5.0),
        "unique": (flat(_MILLION, unique=True), 5.0),
        "hierarchical": (hierarchical(380), 2.0),
    }
    for name, (data, limit) in texts.items():
        with tempfile.NamedTemporaryFile(suffix=".sp") as file:
            file.write(data)
            file.flush()
            command = [sys.executable, __file__, file.name]
            paths = {**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)}
            done = subprocess.run(command, check=True, capture_output=True, env=paths)
            found = json.loads(done.stdout)
        yield Row(f"10^6 transistors, {name}: text to devices", found["seconds"], "s", limit)
        if name == "flat":
            yield Row("the same, peak memory of the process", found["peak"], "GiB", 0.6)


def measure(path: Path) -> None:
    """Lay out a large block and print its time and the peak memory."""
    parser("netlist")
    parser("expression")
    best, peak = float("inf"), 0.0
    for _ in range(_ROUNDS):
        begun = time.process_time()
        elaborate(read(path))
        best = min(best, time.process_time() - begun)
        # What later rounds add is what earlier ones leave.
        peak = peak or peak_memory()
    sys.stdout.write(json.dumps({"seconds": best, "peak": peak}))


def peak_memory() -> float:
    """Return the peak memory of this process, GiB."""
    status = Path("/proc/self/status")
    if not status.exists():
        return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 2**20
    # What the system counts for a process includes what its parent held when it forked.
    line = next(one for one in status.read_text("ascii").splitlines() if "VmHWM" in one)
    return int(line.split()[1]) / 2**20


def rewriting() -> Iterator[Row]:
    """Yield what new widths for 10^6 cards take, from spans to bytes."""
    count = 200_000
    netlist = read_text(flat(count))

    def all_widths() -> None:
        found = netlist.cards.value_places(range(len(netlist)), "w")
        rewrite(
            netlist,
            [EditColumns(p.source, p.starts, p.ends, [b"1.25u"] * len(p.starts)) for p in found],
        )

    yield Row("rewriting 10^6 widths", seconds(all_widths) * _MILLION / len(netlist), "s", 4.0)


def memory() -> Iterator[Row]:
    """Yield the memory kept for one transistor of a flat block, beyond its text."""
    data = flat(100_000)
    read_text(flat(100))
    tracemalloc.start()
    netlist = read_text(data)
    table, _ = tracemalloc.get_traced_memory()
    devices = elaborate(netlist)
    both, _ = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    yield Row("table of cards, names included", table / len(devices), "B", 130.0)
    yield Row("devices, names included", (both - table) / len(devices), "B", 130.0)


def rows() -> Iterator[Row]:
    """Yield the whole table."""
    for part in (reading, layout, rewriting, memory):
        yield from part()


@pytest.mark.benchmark
def test_all_is_within_its_limits() -> None:
    table = list(rows())
    sys.stdout.writelines(f"\n{row}" for row in table)
    assert [row.what for row in table if not row.is_kept] == []


def main() -> None:
    """Print the table, or measure one large block."""
    if len(sys.argv) == 1:
        for row in rows():
            sys.stdout.write(f"{row}\n")
            sys.stdout.flush()
    else:
        measure(Path(sys.argv[1]))


if __name__ == "__main__":
    main()
