"""Rows that were measured on a bench, as a table of cells and pins."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.fitting.measurements import Measurements, Query

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.fitting.bench import Bench
    from evenstage.netlist.devices import FloatArray, IntArray


def tabulate(
    bench: Bench,
    arcs: tuple[IntArray, IntArray, BoolArray],
    stimuli: tuple[FloatArray, FloatArray],
    answers: tuple[FloatArray, FloatArray, FloatArray],
) -> Measurements:
    """Return rows measured on a bench as measurements.

    Parameters
    ----------
    bench : Bench
    arcs : tuple of IntArray, IntArray, BoolArray, shape (rows,)
        Input net, output net, whether the output rises.
    stimuli : tuple of FloatArray, s and F, shape (rows,)
        Transition of the input, load at the output.
    answers : tuple of FloatArray, s, s and F, shape (rows,)
        Delay, transition of the output, capacitance of the input.
    """
    pins = {
        bench.net(number, place): (cell.name, pin)
        for number, cell in enumerate(bench.cells)
        for place, pin in enumerate(cell.signals)
    }
    queries: dict[Query, int] = {}
    query = [
        queries.setdefault(Query(*pins[start], pins[end][1], rising), len(queries))
        for start, end, rising in zip(*(column.tolist() for column in arcs), strict=True)
    ]
    return Measurements(
        queries=tuple(queries),
        query=np.array(query, np.int32),
        transition=stimuli[0],
        load=stimuli[1],
        delay=answers[0],
        output_transition=answers[1],
        input_cap=answers[2],
    )
