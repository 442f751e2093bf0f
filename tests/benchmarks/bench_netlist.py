"""How fast netlists are read, laid out and rewritten, and what memory that takes.

Run ``PYTHONPATH=src:tests python tests/benchmarks/bench_netlist.py``, or ``pytest -m benchmark`` on
this file, which holds the table against its limits. All texts are invented here. Times are CPU
seconds, best of three; ``ref`` is splitting the same bytes into lines and each line into words, in
turns with the reading. The large blocks are measured in processes of their own, for their peak
memory. A neighbour on the machine makes all of it up to twice as slow, ratios a third.
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
from itertools import chain
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

import pytest

from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.grammar import ENCODING, parser
from evenstage.netlist.reading.read import read, read_bytes
from evenstage.netlist.rewriting.edits import EditColumns, rewrite
from support.large_netlists import extracted, flat, hierarchical
from support.stopwatch import ROUNDS, seconds, shortest, words

if TYPE_CHECKING:
    from collections.abc import Iterator

    from evenstage.netlist.netlist import Netlist

_MILLION = 1_000_000


class Row(NamedTuple):
    """One line of the table: what was measured, the value, what it must be and is meant to be.

    ``must`` and ``aim`` are greatest values, negative ones least values.
    """

    what: str
    value: float
    unit: str
    must: float
    aim: float

    def __str__(self) -> str:
        missed = "" if self.is_kept else "  missed"
        limits = f"{_limit(self.must):>8}{_limit(self.aim):>8}"
        return f"{self.what:<55}{self.value:9.2f}{limits}  {self.unit}{missed}"

    @property
    def is_kept(self) -> bool:
        """Whether the value is as it must be."""
        return self.value <= self.must if self.must > 0 else self.value >= -self.must


HEAD = f"{'':<55}{'measured':>9}{'must':>8}{'aim':>8}"


def _limit(limit: float) -> str:
    return f"{'<=' if limit > 0 else '>='} {abs(limit):g}"


def read_text(data: bytes) -> Netlist:
    return read_bytes(data, "block.sp", Path())


def reading() -> Iterator[Row]:
    """Yield how long reading takes, relative to splitting into words and to Lark alone."""
    parser("netlist")  # a quarter of a second, once for all
    texts = {
        "flat, repeated sizes": (flat(300_000), 11.0, 6.0),
        "flat, unique sizes": (flat(300_000, unique=True), 11.0, 6.0),
        "extracted": (extracted(350_000), 15.0, 9.0),
        "hierarchical, with expressions": (hierarchical(380), 13.0, 9.0),
    }
    for name, (data, *limits) in texts.items():
        by_reader, by_splitting = shortest(partial(read_text, data), partial(words, data))
        yield Row(f"reading, {name}", by_reader / by_splitting, "x ref", *limits)
    data = flat(10_000)
    text = data.decode(ENCODING)
    large = texts["flat, repeated sizes"][0]
    by_lark, by_reader = shortest(
        lambda: parser("netlist").parse(text, start="netlist"), partial(read_text, large)
    )
    ratio = by_lark / len(data) / (by_reader / len(large))
    yield Row("the grammar alone, over reading flat text", ratio, "x", -20.0, -20.0)


def layout() -> Iterator[Row]:
    """Yield what large blocks take from text to devices, each measured in its own process."""
    texts = {
        "flat": (flat(_MILLION), 5.0, 3.0),
        "unique": (flat(_MILLION, unique=True), 5.0, 3.0),
        "hierarchical": (hierarchical(380), 2.0, 1.0),
    }
    for name, (data, *limits) in texts.items():
        with tempfile.NamedTemporaryFile(suffix=".sp") as file:
            file.write(data)
            file.flush()
            command = [sys.executable, __file__, file.name]
            paths = {**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)}
            done = subprocess.run(command, check=True, capture_output=True, env=paths)
            found = json.loads(done.stdout)
        yield Row(f"10^6 transistors, {name}: text to devices", found["seconds"], "s", *limits)
        if name == "flat":
            yield Row("the same, peak memory of the process", found["peak"], "GiB", 0.6, 0.4)


def measure(path: Path) -> None:
    """Lay out a large block and print its time and the peak memory."""
    parser("netlist")
    parser("expression")
    best, peak = float("inf"), 0.0
    for _ in range(ROUNDS):
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

    taken = seconds(all_widths) * _MILLION / len(netlist)
    yield Row("rewriting 10^6 widths", taken, "s", 4.0, 2.0)


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
    yield Row(
        "table of cards, a transistor, names included", table / len(devices), "B", 130.0, 60.0
    )
    yield Row(
        "devices, a transistor, names included", (both - table) / len(devices), "B", 130.0, 130.0
    )


def rows() -> Iterator[Row]:
    """Yield the whole table."""
    for part in (reading, layout, rewriting, memory):
        yield from part()


@pytest.mark.benchmark
def test_all_is_within_its_limits() -> None:
    table = list(rows())
    sys.stdout.writelines(f"\n{row}" for row in (HEAD, *table))
    assert [row.what for row in table if not row.is_kept] == []


def main() -> None:
    """Print the table, or measure one large block."""
    if len(sys.argv) == 1:
        for row in chain([HEAD], rows()):
            sys.stdout.write(f"{row}\n")
            sys.stdout.flush()
    else:
        measure(Path(sys.argv[1]))


if __name__ == "__main__":
    main()
