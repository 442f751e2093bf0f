"""What each free node of a batch has a way to, for 64 input vectors at a time.

Where a node surely has a way to one level and not even perhaps to the other, resistances decide
nothing, and neither does charge; that is nearly everywhere. What is left is for `settle`.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

import numpy as np

if TYPE_CHECKING:
    from evenstage.logic.order import Batch
    from evenstage.logic.planes import Planes, Words
    from evenstage.logic.switches import Switches


class Reach(NamedTuple):
    """To what free nodes have a way; shape (free, words) each.

    Parameters
    ----------
    sure_one, sure_zero : Words
        Through switches that are closed.
    maybe_one, maybe_zero : Words
        Through switches that are not open, from what is not known to be otherwise.
    good_one, good_zero : Words
        Surely, through channels alone that pass the level undegraded.
    """

    sure_one: Words
    sure_zero: Words
    maybe_one: Words
    maybe_zero: Words
    good_one: Words
    good_zero: Words

    @property
    def against(self) -> Words:
        """Where a sure way to one level may have another against it: resistances decide."""
        found: Words = (self.sure_one & self.maybe_zero) | (self.sure_zero & self.maybe_one)
        return found

    @property
    def loose(self) -> Words:
        """Where nothing surely drives, and not everything perhaps does: charge decides."""
        driven = self.sure_one | self.sure_zero | (self.maybe_one & self.maybe_zero)
        found: Words = ~driven
        return found


class Charge(NamedTuple):
    """Which values loose nodes may share with each free node; shape (free, words) each."""

    one: Words
    zero: Words
    unknown: Words

    @property
    def mixed(self) -> Words:
        """Where they are several: capacitances decide."""
        return (self.one & self.zero) | ((self.one | self.zero) & self.unknown)


def reach(switches: Switches, batch: Batch, now: Planes) -> Reach:
    """Return to what the free nodes of a batch have a way.

    Parameters
    ----------
    switches : Switches
    batch : Batch
    now : Planes
        Of all nets.
    """
    given = batch.nets[batch.free :]
    one, zero = now.one[given], now.zero[given]
    found = np.zeros((len(batch.nets), 6, one.shape[1]), np.uint64)
    found[batch.free :] = np.stack([one, zero, ~zero, ~one, one, zero], axis=1)
    ways = _spread(batch, found, _passing(switches, batch, now)[batch.switch])
    return Reach(*(ways[:, row] for row in range(6)))


def charge(switches: Switches, batch: Batch, now: Planes, loose: Words) -> Charge:
    """Return what nodes that nothing drives, shape (free, words), may share their charge with."""
    own = batch.nets[: batch.free]
    one, zero = now.one[own], now.zero[own]
    found = np.zeros((len(batch.nets), 3, one.shape[1]), np.uint64)
    found[: batch.free] = np.stack([one, zero, ~(one | zero)], axis=1) & loose[:, None]
    perhaps = _states(switches, batch, now)[1][batch.switch][:, None]
    ways = _spread(batch, found, perhaps)
    return Charge(*(ways[:, row] for row in range(3)))


def _spread(batch: Batch, found: Words, passes: Words) -> Words:
    """Let what is found at nodes, shape (nodes, kinds, words), spread along edges that pass."""
    while True:
        near = np.bitwise_or.reduceat(found[batch.start] & passes, batch.head, axis=0)
        grown = near | found[: batch.free]
        if (grown == found[: batch.free]).all():
            return grown
        found[: batch.free] = grown


def _passing(switches: Switches, batch: Batch, now: Planes) -> Words:
    """Return under which vectors each switch passes on each kind of way, shape (switches, 6, w)."""
    closed, perhaps = _states(switches, batch, now)
    is_n = switches.is_n[batch.device][:, None]
    none = np.zeros_like(closed)
    kinds = (closed, closed, perhaps, perhaps)
    return np.stack([*kinds, np.where(is_n, none, closed), np.where(is_n, closed, none)], axis=1)


def _states(switches: Switches, batch: Batch, now: Planes) -> tuple[Words, Words]:
    """Return where switches are closed, and where they are not open, shape (switches, words)."""
    gate, is_n = switches.gate[batch.device], switches.is_n[batch.device][:, None]
    one, zero = now.one[gate], now.zero[gate]
    return np.where(is_n, one, zero), ~np.where(is_n, zero, one)
