"""Recognition takes as long per transistor in a large block as in a small one."""

from __future__ import annotations

import time
from pathlib import Path

from evenstage.circuit.recognise import recognise
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes
from evenstage.process.generic import generic
from support.large_netlists import hierarchical

SMALL, TIMES = 2, 8
#: A quadratic step would make it 64; neighbours on the machine disturb by less than two.
RATIO_MOST = 2.0 * TIMES


def seconds(blocks: int) -> float:
    """Return the CPU time of recognition with arcs and loads, best of three."""
    process = generic(1.0)
    devices = elaborate(read_bytes(hierarchical(blocks), "block.sp", Path()), process=process)
    found = []
    for _ in range(3):
        begun = time.process_time()
        circuit = recognise(devices, process)
        assert len(circuit.arcs) == len(circuit.arcs.elmore(circuit.net_cap))
        found.append(time.process_time() - begun)
    return min(found)


def test_eight_times_the_transistors_take_no_more_than_twice_eight_times_as_long() -> None:
    large = seconds(SMALL * TIMES)
    # The small one last: whatever is learnt once is learnt by then.
    assert large <= RATIO_MOST * seconds(SMALL)
