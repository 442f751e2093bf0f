"""Reading costs a small multiple of splitting the text into words; the benchmarks say how small."""

from __future__ import annotations

import time
from pathlib import Path
from typing import TYPE_CHECKING

from evenstage.netlist.grammar import parser
from evenstage.netlist.reading.read import read_bytes
from support.large_netlists import flat

if TYPE_CHECKING:
    from collections.abc import Callable


def seconds(action: Callable[[], object]) -> float:
    """Return the CPU time of something, best of three."""
    times = []
    for _ in range(3):
        begun = time.process_time()
        action()
        times.append(time.process_time() - begun)
    return min(times)


def test_flat_text_is_read_many_times_as_fast_as_by_the_grammar_alone() -> None:
    small, large = flat(300), flat(6000)
    by_lark = seconds(lambda: parser("netlist").parse(small.decode("latin-1"), start="netlist"))
    by_reader = seconds(lambda: read_bytes(large, "large.sp", Path()))
    # Measured: 25 to 35 times.
    assert by_lark / len(small) > 6 * by_reader / len(large)
