"""Cells with invented sizes, and what a known process says of their delays."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.fitting.bench import build_bench
from evenstage.fitting.cells import measured_cells
from evenstage.fitting.measurements import Measurements, Query
from evenstage.fitting.prediction import arc_graphs, build_predictor
from evenstage.netlist.reading.read import read
from evenstage.pattern import Pattern
from evenstage.process.process import Process, Transistor

if TYPE_CHECKING:
    from collections.abc import Sequence
    from pathlib import Path

    from evenstage.fitting.bench import Cell

CELLS: Final = """* invented cells
.subckt inv a y vdd vss
mn y a vss vss nch w=1u l=0.13u
mp y a vdd vdd pch w=2u l=0.13u
.ends
.subckt inv3 a y vdd vss
mn y a vss vss nch w=3u l=0.13u
mp y a vdd vdd pch w=4u l=0.13u
.ends
.subckt nand2 a b y vdd vss
mn1 y a m vss nch w=2u l=0.13u
mn2 m b vss vss nch w=2u l=0.13u
mp1 y a vdd vdd pch w=2u l=0.13u
mp2 y b vdd vdd pch w=2u l=0.13u
.ends
.subckt nor3 a b c y vdd vss
mn1 y a vss vss nch w=1u l=0.13u
mn2 y b vss vss nch w=1u l=0.13u
mn3 y c vss vss nch w=1u l=0.13u
mp1 y a m1 vdd pch w=5u l=0.13u
mp2 m1 b m2 vdd pch w=5u l=0.13u
mp3 m2 c vdd vdd pch w=5u l=0.13u
.ends
.subckt nand3 a b c y vdd vss
mn1 y a m1 vss nch w=3u l=0.13u
mn2 m1 b m2 vss nch w=3u l=0.13u
mn3 m2 c vss vss nch w=3u l=0.13u
mp1 y a vdd vdd pch w=2u l=0.13u
mp2 y b vdd vdd pch w=2u l=0.13u
mp3 y c vdd vdd pch w=2u l=0.13u
.ends
.subckt nor2 a b y vdd vss
mn1 y a vss vss nch w=1u l=0.13u
mn2 y b vss vss nch w=1u l=0.13u
mp1 y a m vdd pch w=4u l=0.13u
mp2 m b vdd vdd pch w=4u l=0.13u
.ends
.subckt buf a y vdd vss
mn1 x a vss vss nch w=1u l=0.13u
mp1 x a vdd vdd pch w=2u l=0.13u
mn2 y x vss vss nch w=4u l=0.13u
mp2 y x vdd vdd pch w=8u l=0.13u
.ends
"""

INPUTS: Final = {
    "inv": "a",
    "inv3": "a",
    "nand2": "ab",
    "nand3": "abc",
    "nor2": "ab",
    "nor3": "abc",
    "buf": "a",
}


def truth() -> Process:
    """Return an invented process with every constant of the model in it."""
    n = Transistor(
        models=(Pattern("nch"),),
        polarity="n",
        length=0.13e-6,
        r_w=2.4e-3,
        r_fixed=60.0,
        stack=0.8,
        c_gate=1.5e-9,
        c_gate_fixed=0.2e-15,
        c_drain=1.1e-9,
        c_drain_fixed=0.1e-15,
        slope=0.4,
        slope_power=0.7,
        shape=2.2,
        shape_carry=0.3,
        slope_stack=0.6,
        shape_stack=0.7,
        weak_swing=0.6,
        drain_shared=0.8,
        drain_inner=0.5,
    )
    p = replace(
        n,
        models=(Pattern("pch"),),
        polarity="p",
        r_w=5e-3,
        r_fixed=90.0,
        stack=1.1,
        c_drain=0.9e-9,
        slope=0.35,
        shape=2.4,
        shape_carry=0.25,
        weak_swing=0.8,
    )
    return Process(name="invented", supply=1.2, transistors=(n, p))


def queries(names: Sequence[str]) -> tuple[Query, ...]:
    return tuple(
        Query(name, pin, "y", rising)
        for name in names
        for pin in INPUTS[name]
        for rising in (True, False)
    )


def measure(
    path: Path,
    process: Process,
    names: Sequence[str] = tuple(INPUTS),
    transitions: Sequence[float] = (20e-12, 50e-12, 120e-12, 250e-12),
    loads: Sequence[float] = (1e-15, 6e-15, 20e-15, 60e-15),
    rows: Measurements | None = None,
) -> tuple[Measurements, tuple[Cell, ...]]:
    """Return what a process says of some cells of a netlist file, as measurements.

    Of given rows their arcs, transitions and loads count, in place of names and grid.
    """
    empty = rows if rows is not None else _grid(names, transitions, loads)
    cells = measured_cells(empty, read(path), process)
    bench = build_bench(path, cells, process)
    predictor = build_predictor(bench, arc_graphs(bench, empty.queries), empty)
    found = predictor(bench.circuit.process)
    return (
        replace(
            empty,
            delay=found.delay,
            output_transition=found.output_transition,
            input_cap=found.input_cap,
        ),
        cells,
    )


def _grid(
    names: Sequence[str], transitions: Sequence[float], loads: Sequence[float]
) -> Measurements:
    asked = queries(names)
    query, transition, load = (
        grid.ravel()
        for grid in np.meshgrid(np.arange(len(asked)), transitions, loads, indexing="ij")
    )
    nothing = np.full(len(query), np.nan)
    return Measurements(
        queries=asked,
        query=query.astype(np.int32),
        transition=transition,
        load=load,
        delay=nothing,
        output_transition=nothing,
        input_cap=nothing,
    )
