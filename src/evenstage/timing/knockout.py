"""The latest of the arrivals at each node: they meet in pairs, and the later one goes on.

After each round half of them are left. Most nodes have two or three arcs, for which this is three
times as fast as reducing run by run (measured on 285,000 stages), and it tells which one won.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray, IntArray

Rounds = tuple[tuple["IntArray", "IntArray"], ...]
"""For each round the places of those that meet, in order; one without a partner meets itself."""


def rounds_of(count: IntArray) -> Rounds:
    """Return the rounds for runs of some lengths, each at least 1, one behind the other."""
    rounds = []
    while count.max(initial=0) > 1:
        pairs = (count + 1) // 2
        end = np.cumsum(count)
        number = np.arange(pairs.sum()) - np.repeat(np.cumsum(pairs) - pairs, pairs)
        first = (np.repeat(end - count, pairs) + 2 * number).astype(np.int32)
        second = np.minimum(first + 1, np.repeat(end - 1, pairs)).astype(np.int32)
        rounds.append((first, second))
        count = pairs
    return tuple(rounds)


def latest(candidate: FloatArray, rounds: Rounds) -> tuple[FloatArray, IntArray]:
    """Return the maximum of each run and where it stands, of equal ones the first.

    Parameters
    ----------
    candidate : FloatArray, shape (k, ...)
        Trailing axes are blocks side by side.
    rounds : Rounds

    Returns
    -------
    maximum : FloatArray, shape (runs, ...)
    place : IntArray, shape (runs, ...)
    """
    column = (-1, *(1 for _ in candidate.shape[1:]))
    place = None
    for first, second in rounds:
        one, other = candidate[first], candidate[second]
        later = other > one
        candidate = np.maximum(one, other)
        if place is None:
            place = np.where(later, second.reshape(column), first.reshape(column))
        else:
            place = np.where(later, place[second], place[first])
    if place is None:
        every = np.arange(len(candidate), dtype=np.int32).reshape(column)
        place = np.broadcast_to(every, candidate.shape)
    return candidate, place
