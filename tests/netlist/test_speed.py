"""Reading costs a small multiple of splitting the text into words; the benchmarks say how small.

The limits are those of ``tests/benchmarks/bench_netlist.py`` with half as much again: neighbours on
the machine slow reading down more than the splitting it is held against; where they are many, the
measurement is repeated. A way of reading that has lost its speed is several times as slow.
"""

from __future__ import annotations

from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from evenstage.netlist.grammar import ENCODING, parser
from evenstage.netlist.reading.read import read_bytes
from evenstage.netlist.rewriting.edits import EditColumns, apply_edits
from support.large_netlists import extracted, flat, hierarchical
from support.stopwatch import shortest, words

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.netlist.netlist import Netlist

SLACK = 1.5
ATTEMPTS = 5


def is_within(times: float, action: Callable[[], object], other: Callable[[], object]) -> bool:
    """Tell whether an action takes at most so many times what another one takes."""
    measured = (shortest(action, other) for _ in range(ATTEMPTS))
    return any(of_action < times * of_other for of_action, of_other in measured)


def read_text(data: bytes) -> Netlist:
    return read_bytes(data, "large.sp", Path())


@pytest.mark.parametrize(
    ("data", "must"),
    [
        pytest.param(flat(30_000), 11, id="flat"),
        pytest.param(flat(30_000, unique=True), 11, id="unique"),
        pytest.param(extracted(50_000), 15, id="extracted"),
        pytest.param(hierarchical(190), 13, id="hierarchical"),
    ],
)
def test_reading_takes_a_few_times_what_splitting_into_words_takes(data: bytes, must: int) -> None:
    assert is_within(SLACK * must, partial(read_text, data), partial(words, data))


def test_flat_text_is_read_many_times_as_fast_as_by_the_grammar_alone() -> None:
    small, large = flat(1000), flat(20_000)
    text = small.decode(ENCODING)
    times = SLACK / 20 * len(large) / len(small)
    assert is_within(
        times, partial(read_text, large), lambda: parser("netlist").parse(text, start="netlist")
    )


def test_rewriting_all_widths_takes_no_longer_than_reading_them() -> None:
    data = flat(20_000)
    netlist = read_text(data)

    def rewritten() -> bytes:
        (p,) = netlist.cards.value_places(range(len(netlist)), "w")
        edits = EditColumns(p.source, p.starts, p.ends, [b"1.25u"] * len(p.starts))
        return apply_edits(p.source, [edits])

    assert rewritten().count(b"=1.25u") >= len(netlist)
    assert is_within(1, rewritten, partial(read_text, data))
