"""Arcs in columns: sums of monomials in the sizes of the gates they run through.

The Elmore delay of an arc is a sum over the capacitances that move, each times the resistance its
charge flows through. Resistances and capacitances that scale belong to some gate, their *owner*;
with ``x`` the size of a gate relative to today,

    E = sum over charges R / x_owner * C(net) + sum over own terms R / x_res_owner * C * x_cap_owner

where ``C(net)`` is what hangs on a net outside the gates of the arc. What does not scale has no
owner. A plain gate charges one net through itself.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, TypeVar

import numpy as np
from scipy.sparse import csr_array

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray

_Kind = TypeVar("_Kind", bound=np.generic)

NO_OWNER = -1
"""Owner of a resistance or capacitance that does not scale."""


@dataclass(frozen=True)
class Charges:
    """Outside capacitance that arcs charge; shape ``(charges,)`` but for ``head``.

    Parameters
    ----------
    head : IntArray, shape (arcs + 1,)
        Charges of arc k are ``head[k]:head[k + 1]``.
    net : IntArray
        Whose outside capacitance is charged.
    owner : IntArray
        Gate whose size divides the resistance; `NO_OWNER` for none.
    resistance : FloatArray, ohm
        With the stack factor.
    """

    head: IntArray
    net: IntArray
    owner: IntArray
    resistance: FloatArray

    @cached_property
    def arc(self) -> IntArray:
        """The arc of each charge."""
        return np.repeat(np.arange(len(self.head) - 1, dtype=np.int32), np.diff(self.head))


@dataclass(frozen=True)
class OwnTerms:
    """Delay of the capacitances of an arc's own gates; shape ``(terms,)`` but for ``head``.

    Parameters
    ----------
    head : IntArray, shape (arcs + 1,)
        Terms of arc k are ``head[k]:head[k + 1]``.
    resistance : FloatArray, ohm
    resistance_owner : IntArray
    capacitance : FloatArray, F
        What, charged through that resistance, takes as long as all that moves.
    capacitance_owner : IntArray
    """

    head: IntArray
    resistance: FloatArray
    resistance_owner: IntArray
    capacitance: FloatArray
    capacitance_owner: IntArray

    @cached_property
    def arc(self) -> IntArray:
        """The arc of each term."""
        return np.repeat(np.arange(len(self.head) - 1, dtype=np.int32), np.diff(self.head))

    @property
    def today(self) -> FloatArray:
        """Delay of each term at today's sizes, s."""
        return self.resistance * self.capacitance


@dataclass(frozen=True)
class Arcs:
    """Arcs from one input edge to one output edge; shape ``(arcs,)`` each.

    Parameters
    ----------
    gate, input, output : IntArray
        Gate whose input moves; net ids.
    rising : BoolArray
        Whether the output rises.
    input_rising : BoolArray
        Whether the input rises.
    charges : Charges
    own : OwnTerms
    slope, slope_power, shape, shape_carry : FloatArray
        Transition constants of the switching transistor.
    """

    gate: IntArray
    input: IntArray
    output: IntArray
    rising: BoolArray
    input_rising: BoolArray
    charges: Charges
    own: OwnTerms
    slope: FloatArray
    slope_power: FloatArray
    shape: FloatArray
    shape_carry: FloatArray

    def __len__(self) -> int:
        return len(self.gate)

    @cached_property
    def own_today(self) -> FloatArray:
        """Delay of the gates' own capacitance at today's sizes, s."""
        return _sums(self.own.arc, self.own.today, len(self))

    @cached_property
    def output_resistance(self) -> FloatArray:
        """Resistance between the output net and the supply at today's sizes, ohm."""
        charges = self.charges
        at_output = charges.net == self.output[charges.arc]
        return _sums(charges.arc, charges.resistance * at_output, len(self))

    def elmore(self, net_cap: FloatArray) -> FloatArray:
        """Return Elmore delays, s, shape (arcs, ...), at outside capacitances (nets, ...), F."""
        charges = self.charges
        through = csr_array(
            (charges.resistance, charges.net, charges.head), shape=(len(self), len(net_cap))
        )
        beside = (-1, *(1 for _ in net_cap.shape[1:]))
        result: FloatArray = through @ net_cap + self.own_today.reshape(beside)
        return result

    def take(self, which: IntArray) -> Arcs:
        """Return some of the arcs, in that order."""
        return _chosen([self], which.astype(np.intp))

    def gates_along(self, which: IntArray) -> IntArray:
        """Return the gates that some arcs run through, arc by arc, one as often as it charges."""
        head = self.charges.head
        owner = self.charges.owner[ranges(head[which], head[which + 1] - head[which])]
        found: IntArray = owner[owner != NO_OWNER]
        return found


def joined(parts: Sequence[Arcs]) -> Arcs:
    """Put tables into one, ordered by gate; arcs of one gate in the order given."""
    return _chosen(parts, np.argsort(np.concatenate([part.gate for part in parts]), kind="stable"))


def _chosen(parts: Sequence[Arcs], order: NDArray[np.intp]) -> Arcs:
    """Put arcs of several tables into one, in an order of all of them under each other."""

    def ordered(columns: Sequence[NDArray[_Kind]]) -> NDArray[_Kind]:
        return np.concatenate(columns)[order]

    charges, own = [part.charges for part in parts], [part.own for part in parts]
    charge_head, charge = _csr([some.head for some in charges], order)
    own_head, term = _csr([some.head for some in own], order)
    return Arcs(
        gate=ordered([part.gate for part in parts]),
        input=ordered([part.input for part in parts]),
        output=ordered([part.output for part in parts]),
        rising=ordered([part.rising for part in parts]),
        input_rising=ordered([part.input_rising for part in parts]),
        charges=Charges(
            head=charge_head,
            net=np.concatenate([some.net for some in charges])[charge],
            owner=np.concatenate([some.owner for some in charges])[charge],
            resistance=np.concatenate([some.resistance for some in charges])[charge],
        ),
        own=OwnTerms(
            head=own_head,
            resistance=np.concatenate([some.resistance for some in own])[term],
            resistance_owner=np.concatenate([some.resistance_owner for some in own])[term],
            capacitance=np.concatenate([some.capacitance for some in own])[term],
            capacitance_owner=np.concatenate([some.capacitance_owner for some in own])[term],
        ),
        slope=ordered([part.slope for part in parts]),
        slope_power=ordered([part.slope_power for part in parts]),
        shape=ordered([part.shape for part in parts]),
        shape_carry=ordered([part.shape_carry for part in parts]),
    )


def ranges(begin: NDArray[np.integer], count: NDArray[np.integer]) -> IntArray:
    """Return the concatenation of ``range(begin, begin + count)`` for all entries."""
    ends = np.cumsum(count)
    total = int(ends[-1]) if len(ends) else 0
    result: IntArray = (
        np.arange(total) - np.repeat(ends - count, count) + np.repeat(begin, count)
    ).astype(np.int32)
    return result


def _csr(heads: Sequence[IntArray], order: NDArray[np.intp]) -> tuple[IntArray, IntArray]:
    """Return where the entries of each ordered arc begin, and their places in the tables."""
    count = np.concatenate([np.diff(head) for head in heads])
    most = int(count.max(initial=0))
    if most == count.min(initial=0):
        # The common case, in half the time: all have as many.
        head = np.arange(len(order) + 1, dtype=np.int32) * most
        return head, (order[:, None] * most + np.arange(most)).ravel()
    begin = np.cumsum(count) - count
    head = np.concatenate([[0], np.cumsum(count[order])]).astype(np.int32)
    return head, ranges(begin[order], count[order])


def _sums(arc: IntArray, value: FloatArray, arcs: int) -> FloatArray:
    return np.bincount(arc, value, arcs).astype(np.float64, copy=False)
