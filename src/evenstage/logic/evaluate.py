"""Values of all nets under many input vectors, or sequences of them."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.logic.order import batches
from evenstage.logic.settle import GIVEN, KEPT, settle, strengths
from evenstage.logic.switches import UNKNOWN

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.logic.order import Batch
    from evenstage.logic.switches import BoolArray, Switches, Values
    from evenstage.netlist.devices import IntArray

#: Values held at once while a batch is settled: about half a gigabyte of tables.
_CELLS_MOST: Final = 4_000_000


@dataclass(frozen=True)
class Evaluation:
    """Values of all nets, shape (nets, steps, vectors) each.

    Parameters
    ----------
    values : Values
        0, 1 or `evenstage.logic.switches.UNKNOWN`.
    strength : Values
        ``GIVEN``, ``STRONG``, ``WEAK`` or ``KEPT`` of `evenstage.logic.settle`.
    names : sequence of str
        Of the nets.
    """

    values: Values
    strength: Values
    names: Sequence[str] = field(repr=False)


def evaluate(
    switches: Switches, inputs: Mapping[int, Values], *, strong: bool = True
) -> Evaluation:
    """Return what every net is worth.

    Loops of groups are settled in unit delays from the values before; what goes on changing there
    is unknown.

    Parameters
    ----------
    switches : Switches
    inputs : mapping of int to Values, shape (steps, vectors) each
        Values of nets, by id. Vectors are independent of each other; along the steps, storage and
        charge are kept. In the first step they are unknown.
    strong : bool
        Whether strengths are wanted; without, all are ``KEPT``.
    """
    given = switches.supply != UNKNOWN
    given[list(inputs)] = True
    order = batches(switches, given)
    steps, vectors = next((one.shape for one in inputs.values()), (1, 1))
    shape = (len(given), steps, vectors)
    values, strength = np.empty(shape, np.int8), np.full(shape, KEPT, np.int8)
    widest = max((len(batch.switch) + len(batch.nets) for batch in order), default=1)
    lanes = max(1, _CELLS_MOST // widest)
    for first in range(0, vectors, lanes):
        now = np.repeat(switches.supply[:, None], min(lanes, vectors - first), axis=1)
        for step in range(steps):
            part = slice(first, first + lanes)
            for net, wanted in inputs.items():
                now[net] = wanted[step, part]
            for batch in order:
                _settle_batch(switches, batch, now)
                if strong:
                    strength[batch.nets[: batch.free], step, part] = strengths(switches, batch, now)
            values[:, step, part] = now
    strength[given] = GIVEN
    for array in (values, strength):
        array.setflags(write=False)
    return Evaluation(values, strength, switches.names)


def _settle_batch(switches: Switches, batch: Batch, values: Values) -> None:
    """Settle a batch in place: once, or where it loops until nothing changes any more."""
    own = batch.nets[: batch.free]
    if not batch.loops:
        values[own] = settle(switches, batch, values)
        return
    rounds, most = 0, 2 * batch.groups + 8
    waiting = np.arange(values.shape[1])
    while len(waiting):
        some = values[:, waiting]
        new, old = settle(switches, batch, some), some[own]
        changed: BoolArray = (new != old).any(axis=0)
        if rounds >= most:
            # Unknown stays unknown from here on: each round adds some, so there is a last one.
            new = np.where(new == old, old, UNKNOWN).astype(np.int8)
            changed = (new != old).any(axis=0)
        values[np.ix_(own, waiting)] = new
        waiting = waiting[changed]
        rounds += 1


def input_table(count: int) -> Values:
    """Return all vectors of some inputs, shape (inputs, 1, 2**inputs); the first is bit 0."""
    table: IntArray = np.arange(1 << count) >> np.arange(count)[:, None] & 1
    return table.astype(np.int8)[:, None]
