"""Values of all nets under many input vectors, or sequences of them."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.logic.excerpt import excerpt
from evenstage.logic.order import batches
from evenstage.logic.planes import WIDE, Planes, bits, table
from evenstage.logic.reach import charge, reach
from evenstage.logic.settle import GIVEN, KEPT, STRONG, WEAK, settle
from evenstage.logic.switches import UNKNOWN

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.logic.excerpt import Excerpt
    from evenstage.logic.order import Batch
    from evenstage.logic.planes import Words
    from evenstage.logic.switches import Switches, Values
    from evenstage.netlist.devices import IntArray

#: Values held at once while resistances are compared: about half a gigabyte of tables.
_CELLS_MOST: Final = 4_000_000
#: Words held at once while ways are followed: about a quarter of a gigabyte of tables.
_WORDS_MOST: Final = 4_000_000


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
    widest = max((len(batch.start) + len(batch.nets) for batch in order), default=1)
    lanes = WIDE * max(1, _WORDS_MOST // (6 * widest))
    for first in range(0, vectors, lanes):
        count = min(lanes, vectors - first)
        part = slice(first, first + count)
        now = Planes.of(np.repeat(switches.supply[:, None], count, axis=1))
        for step in range(steps):
            for net, wanted in inputs.items():
                now.put(net, wanted[step, part])
            for batch in order:
                _settle_batch(switches, batch, now, count)
                if strong:
                    own = batch.nets[: batch.free]
                    strength[own, step, part] = _strengths(switches, batch, now, count)
            values[:, step, part] = now.values(count)
    strength[given] = GIVEN
    for array in (values, strength):
        array.setflags(write=False)
    return Evaluation(values, strength, switches.names)


def _settle_batch(switches: Switches, batch: Batch, now: Planes, vectors: int) -> None:
    """Settle a batch in place: once, or where it loops until nothing changes any more."""
    own = batch.nets[: batch.free]
    if not batch.loops:
        every = bits(np.ones(vectors, bool))
        now.one[own], now.zero[own] = _settled(switches, batch, now, vectors, every)
        return
    rounds, most = 0, 2 * batch.groups + 8
    waiting = bits(np.ones(vectors, bool))
    while waiting.any():
        one, zero = _settled(switches, batch, now, vectors, waiting)
        if rounds >= most:
            # Unknown stays unknown from here on: each round adds some, so there is a last one.
            one, zero = one & now.one[own], zero & now.zero[own]
        # Vectors that have come to rest stay as they are.
        to_one, to_zero = (one ^ now.one[own]) & waiting, (zero ^ now.zero[own]) & waiting
        now.one[own] ^= to_one
        now.zero[own] ^= to_zero
        waiting = np.bitwise_or.reduce(to_one | to_zero, axis=0)
        rounds += 1


def _settled(
    switches: Switches, batch: Batch, now: Planes, vectors: int, asked: Words
) -> tuple[Words, Words]:
    """Return where the free nodes are 1 and 0 next, shape (free, words) each, as far as asked."""
    ways = reach(switches, batch, now)
    one, zero = ways.sure_one & ~ways.maybe_zero, ways.sure_zero & ~ways.maybe_one
    loose = ways.loose & asked
    undecided = ways.against & asked
    if loose.any():
        kept = charge(switches, batch, now, loose)
        one |= loose & kept.one & ~ways.maybe_zero
        zero |= loose & kept.zero & ~ways.maybe_one
        undecided |= loose & kept.mixed
    if undecided.any():
        some = excerpt(switches, batch, np.asarray(undecided.any(axis=1)))
        which = np.bitwise_or.reduce(undecided, axis=0)
        at = np.flatnonzero(table(which, vectors))
        found = np.full((some.batch.free, vectors), UNKNOWN, np.int8)
        found[:, at] = _compared(some, now.values(vectors, some.nets)[:, at])
        one[some.nodes] = (one[some.nodes] & ~which) | bits(found == 1)
        zero[some.nodes] = (zero[some.nodes] & ~which) | bits(found == 0)
    return one, zero


def _compared(some: Excerpt, values: Values) -> Values:
    """Return what free nodes are worth, resistances and charge compared, shape (free, vectors)."""
    lanes = max(1, _CELLS_MOST // (len(some.batch.start) + len(some.batch.nets)))
    parts = [
        settle(some.switches, some.batch, values[:, first : first + lanes])
        for first in range(0, values.shape[1], lanes)
    ]
    return np.concatenate(parts, axis=1)


def _strengths(switches: Switches, batch: Batch, now: Planes, vectors: int) -> Values:
    """Return how strongly the free nodes are driven once settled, shape (free, vectors)."""
    ways, own = reach(switches, batch, now), batch.nets[: batch.free]
    alone = now.one[own] & ~ways.maybe_zero & ways.good_one
    alone |= now.zero[own] & ~ways.maybe_one & ways.good_zero
    driven = table(ways.sure_one | ways.sure_zero, vectors)
    return np.where(table(alone, vectors), STRONG, np.where(driven, WEAK, KEPT)).astype(np.int8)


def input_table(count: int) -> Values:
    """Return all vectors of some inputs, shape (inputs, 1, 2**inputs); the first is bit 0."""
    table: IntArray = np.arange(1 << count) >> np.arange(count)[:, None] & 1
    return table.astype(np.int8)[:, None]
