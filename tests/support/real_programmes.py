"""Sizing programmes of the real model: a netlist of transistors through every room."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.brief import Brief
from evenstage.circuit.recognise import recognise
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.rewriting.handles import width_handles
from evenstage.sizing.block_engine import engine_of
from evenstage.sizing.partition import partition
from evenstage.sizing.timed import Timed
from evenstage.sizing.variables import variables
from evenstage.sizing.wishes import Original, Wishes
from evenstage.timing.analyse import analyse

if TYPE_CHECKING:
    from evenstage.netlist.netlist import Netlist
    from evenstage.process.process import Process
    from evenstage.sizing.engine import Engine


def whole_block(netlist: Netlist, process: Process, copies: int = 4) -> Engine:
    """Return the engine of a block in which every card may grow and shrink."""
    devices = elaborate(netlist, process=process)
    timing = analyse(recognise(devices, process)).timing
    assert timing is not None
    parts = partition(timing.circuit, Brief())
    handles = width_handles(devices, process, parts.variable_of, copies)
    free = variables(timing.circuit, Brief(), parts, handles)
    wishes = Wishes(scope="block", reclaim=True)
    return engine_of(Timed((timing,)), Brief(), wishes, [Original()], free)
