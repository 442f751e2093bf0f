"""A bench on which every cell stands in several sizes.

Constant parts cannot be told from proportional ones on one size (see README, fitting).
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.fitting.bench import Bench, build_bench

if TYPE_CHECKING:
    from collections.abc import Sequence
    from pathlib import Path

    from evenstage.fitting.bench import Cell
    from evenstage.process.process import Process

#: All widths of a cell, relative to those drawn.
SIZES: Final = (1, 2, 4)


def sized_bench(
    path: Path, cells: Sequence[Cell], process: Process, sizes: Sequence[int] = SIZES
) -> Bench:
    """Put cells of one gate each on a bench, in several sizes; larger ones have names of their own.

    Raises
    ------
    EvenstageError
        Where the file cannot be read.
    """
    many = [(cell, size) for size in sizes for cell in cells]
    bench = build_bench(path, [cell for cell, _ in many], process)
    circuit = bench.circuit
    size_of_net = {
        bench.net(number, place): size
        for number, (cell, size) in enumerate(many)
        for place in range(len(cell.signals))
    }
    factor = np.ones(len(circuit.devices))
    for gate, output in enumerate(circuit.gate_output.tolist()):
        factor[circuit.gate_devices(gate)] = size_of_net[output]
    named = tuple(
        cell if size == 1 else replace(cell, name=f"{cell.name} x{size}") for cell, size in many
    )
    return Bench(named, circuit.resized(factor))
