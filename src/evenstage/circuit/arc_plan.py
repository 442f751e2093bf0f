"""Which switches and nodes the arcs of a form run over: worked out once for all its gates."""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.gate import ArcForm, GateForm
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray

NOTHING = -1
"""Beyond the end of a path, and where a moved node lies behind no switch."""


@dataclass(frozen=True)
class ArcPlan:
    """Some arcs of a form as indices.

    Parameters
    ----------
    arcs : tuple of ArcForm
    rising : BoolArray, shape (arcs,)
        Whether the output rises.
    path : IntArray, shape (paths, longest)
        Switches from the supply to the output; `NOTHING` beyond. First the arcs' own paths, then
        those beside them.
    length : IntArray, shape (paths,)
    beside : tuple of (int, ...)
        For each arc the rows of the paths that share its current, its own first.
    switching : IntArray, shape (arcs,)
        The switch whose input moves. A load that has been overpowered is not switched: the edge
        through it begins in the network.
    of_arc, node, step, behind : IntArray, shape (moved nodes of all arcs,)
        Which arc moves it; its row among the inner nodes; row of ``path``, flattened, from which
        its charge flows to the supply; the switch that ties it to the output against its own
        polarity.
    begin : IntArray, shape (arcs,)
        Where the moved nodes of each arc begin.
    moves : BoolArray, shape (arcs,)
        Whether an arc moves any.
    """

    arcs: tuple[ArcForm, ...]
    rising: BoolArray
    path: IntArray
    length: IntArray
    beside: tuple[tuple[int, ...], ...]
    switching: IntArray
    of_arc: IntArray
    node: IntArray
    step: IntArray
    behind: IntArray
    begin: IntArray
    moves: BoolArray

    def added(self, values: FloatArray) -> FloatArray:
        """Add up values of moved nodes, shape (moved nodes, k), arc by arc: shape (arcs, k)."""
        total = np.zeros((len(self.arcs), values.shape[1]))
        if len(values):
            total[self.moves] = np.add.reduceat(values, self.begin[self.moves], axis=0)
        return total


def arc_plan(form: GateForm, arcs: Sequence[ArcForm]) -> ArcPlan:
    """Return the plan of some arcs of a form, at least one."""
    ways = [arc.path for arc in arcs] + [one.path for arc in arcs for one in arc.beside]
    longest = max(map(len, ways))
    path = np.full((len(ways), longest), NOTHING, np.int32)
    for row, way in enumerate(ways):
        path[row, : len(way)] = way[::-1]
    further = itertools.count(len(arcs))
    beside = tuple(
        (row, *itertools.islice(further, len(arc.beside))) for row, arc in enumerate(arcs)
    )
    rows = {node: row for row, node in enumerate(form.network.inner_nodes)}
    moved = [
        (number, rows[node], row * longest + count - 1, dict(arc.behind).get(node, NOTHING))
        for number, arc in enumerate(arcs)
        for row, way in zip(beside[number], arc.ways, strict=True)
        for node, count in way.moved
    ]
    of_arc, node, step, behind = np.array(moved, np.int32).reshape(-1, 4).T
    count = np.bincount(of_arc, minlength=len(arcs))
    return ArcPlan(
        arcs=tuple(arcs),
        rising=np.array([arc.rising for arc in arcs], bool),
        path=path,
        length=np.array([len(way) for way in ways], np.int32),
        beside=beside,
        switching=np.array([_switching(form, arc) for arc in arcs], np.int32),
        node=node,
        step=step,
        behind=behind,
        of_arc=of_arc,
        begin=(np.cumsum(count) - count).astype(np.int32),
        moves=count > 0,
    )


def _switching(form: GateForm, arc: ArcForm) -> int:
    closing = (i for i in arc.path if form.network.switches[i].gate == arc.input)
    return next(closing, arc.path[0])
