r"""Transmission gates whose two controls come one after the other.

Where an inverter makes one control of a transmission gate out of the other, one of its transistors
conducts before the other does, and the output moves from then on. A single pole whose resistance
falls while it charges gets on by the share of its time constant that passes: with the Elmore delays
E' through the first transistor alone and E through both, the second one coming g later, half of
the swing is reached when ``g / E' + (t - g) / E = 1``, or

    t = E + g w,    w = 1 - E / E',

counted from the first control; the second adds nothing once ``g > E'``, so this is never below what
it stands for. (An RC response is ``1 - exp(-integral of dt / RC)``, whatever R does.) The arc thus
begins at the first control, carries ``w`` of the inverter's delay beside its own, and none begins
at the second.

For sums of monomials w must not depend on widths. It is that of a route whose steps and nodes are
all alike, through a gate of two equally wide transistors: with k the resistance of the first over
that of both, m nodes that move, and D their steps to the supply added up,
``w = (k - 1) m / (D + (k - 1) m)``.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, TypeVar

import numpy as np

from evenstage.circuit.arcs import Charges, OwnTerms, joined, ranges
from evenstage.circuit.function import Literal
from evenstage.circuit.gate_arcs import arcs_of
from evenstage.circuit.stage_tables import WEAK, stage_arcs

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from numpy.typing import NDArray

    from evenstage.circuit.arcs import Arcs
    from evenstage.circuit.electrical import Electrical
    from evenstage.circuit.network import BoolArray
    from evenstage.circuit.stage_form import StageArc, StageForm
    from evenstage.circuit.stage_tables import AlikeStages
    from evenstage.circuit.tables import AlikeGates
    from evenstage.netlist.devices import FloatArray, IntArray

_Kind = TypeVar("_Kind", bound=np.generic)


class Inverters:
    """The arcs of a circuit's inverters, found by the nets they lead between.

    Parameters
    ----------
    alike : iterable of AlikeGates
    arcs : Arcs
        Of these gates.
    nets : int
        How many there are.
    """

    def __init__(self, alike: Iterable[AlikeGates], arcs: Arcs, nets: int) -> None:
        inverting = [
            some.gates
            for some in alike
            if isinstance(some.form.pull_down, Literal) and some.form.kind == "static gate"
        ]
        gates = np.concatenate([np.zeros(0, np.int32), *inverting])
        own = np.flatnonzero(np.isin(arcs.gate, gates))
        self.arcs, self._nets = arcs, nets
        keys = self._keys(arcs.input[own], arcs.output[own], arcs.input_rising[own])
        order = np.argsort(keys, kind="stable")
        self._key, self._arc = keys[order], own[order]

    def _keys(self, entry: IntArray, output: IntArray, rising: BoolArray) -> IntArray:
        keys: IntArray = (entry.astype(np.int64) * self._nets + output) * 2 + rising
        return keys

    def between(self, entry: IntArray, output: IntArray, *, rising: bool) -> IntArray:
        """Return the arc from one net to another for an edge of the input, -1 for none."""
        if not len(self._key):
            return np.full(len(entry), -1)
        wanted = self._keys(entry, output, np.full(len(entry), rising))
        place = np.minimum(np.searchsorted(self._key, wanted), len(self._key) - 1)
        return np.where(self._key[place] == wanted, self._arc[place], -1)


def arcs_with_stages(
    alike: Sequence[AlikeGates],
    stages: Sequence[AlikeStages],
    values: Electrical,
    node_cap: FloatArray,
    drive: FloatArray,
    width: FloatArray,
) -> Arcs:
    """Return the arcs of all gates and stages, ordered by gate.

    Parameters
    ----------
    alike : sequence of AlikeGates
    stages : sequence of AlikeStages
        One of the two has arcs.
    values : Electrical
    node_cap : FloatArray, F, shape (nets,)
        See `arcs_of`.
    drive : FloatArray, ohm, shape (nets,)
        See `stage_arcs`.
    width : FloatArray, m, shape (devices,)
        With copies.
    """
    through = [stage_arcs(some, values, drive) for some in stages]
    if not any(some.form.arcs for some in alike):
        return joined(through)
    plain = arcs_of(alike, values, node_cap)
    if not stages:
        return plain
    inverters = Inverters(alike, plain, len(node_cap))
    beside = (
        opened_in_turn(arcs, some, values.resistance.scaling * width, inverters)
        for arcs, some in zip(through, stages, strict=True)
    )
    return joined([plain, *beside])


def opened_in_turn(arcs: Arcs, some: AlikeStages, r_w: FloatArray, inverters: Inverters) -> Arcs:
    """Return the arcs of stages of one form with those of controls that follow each other joined.

    Parameters
    ----------
    arcs : Arcs
        Of these stages, stage by stage.
    some : AlikeStages
    r_w : FloatArray, ohm m, shape (devices,)
        Resistance of a width in each device's length.
    inverters : Inverters
    """
    shape = (len(some.gates), len(some.form.arcs))
    maker, share = np.full(shape, -1), np.zeros(shape)
    kept = np.ones(shape, bool)
    of_switch = r_w[some.devices[:, some.form.network.first_devices]]
    for column, arc in enumerate(some.form.arcs):
        pair = _controls(some.form, arc)
        if pair is None:
            continue
        own, other = (some.nets[:, net] for net in pair)
        maker[:, column] = inverters.between(own, other, rising=arc.input_rising)
        second = inverters.between(other, own, rising=not arc.input_rising) >= 0
        kept[:, column] = ~second | (maker[:, column] >= 0)
        share[:, column] = _share(some.form, of_switch, arc)
    if (maker < 0).all() and kept.all():
        return arcs
    both = _with_share(arcs, maker.ravel(), share.ravel(), inverters.arcs)
    return both.take(np.flatnonzero(kept.ravel()))


def _controls(form: StageForm, arc: StageArc) -> tuple[int, int] | None:
    """Return the control that opens a transmission gate and its other one; None: there are not two.

    Local nets.
    """
    step = next((one for one in arc.steps if arc.switching in one.switches), None)
    if step is None or len(step.switches) == 1:
        return None
    switches = form.network.switches
    own = switches[arc.switching]
    others = {switches[i].gate for i in step.switches if switches[i].polarity != own.polarity}
    if len(others) != 1 or min(others) < 0:
        return None
    return own.gate, min(others)


def _share(form: StageForm, of_switch: FloatArray, arc: StageArc) -> FloatArray:
    """Return w of one arc, shape (k,).

    ``of_switch`` is the resistance of a width of each switch, ohm m, shape (k, switches).
    """
    step = next(one for one in arc.steps if arc.switching in one.switches)
    polarity = [form.network.switches[i].polarity for i in step.switches]
    own, other = (
        of_switch[:, step.switches[polarity.index(one)]]
        * (WEAK if (one == "n") == arc.rising else 1.0)
        for one in ("np" if form.network.switches[arc.switching].polarity == "n" else "pn")
    )
    more = own / other * len(arc.moved)
    result: FloatArray = more / (sum(depth for _, depth in arc.moved) + more)
    return result


def _with_share(arcs: Arcs, maker: IntArray, share: FloatArray, plain: Arcs) -> Arcs:
    """Return arcs with a share of another one's delay each; -1: of none."""
    target = np.flatnonzero(maker >= 0)
    source, part = maker[target], share[target]

    def more(head: IntArray) -> tuple[IntArray, IntArray, FloatArray]:
        count = np.diff(head)[source]
        entry = ranges(head[source], count)
        return np.repeat(target, count), entry, np.repeat(part, count)

    charge_arc, charge, charge_share = more(plain.charges.head)
    term_arc, term, term_share = more(plain.own.head)
    mine, own = arcs.charges, arcs.own
    order = np.argsort(np.concatenate([mine.arc, charge_arc]), kind="stable")
    own_order = np.argsort(np.concatenate([own.arc, term_arc]), kind="stable")

    theirs, beside = plain.charges, plain.own
    return replace(
        arcs,
        charges=Charges(
            head=_head(len(arcs), mine.arc, charge_arc),
            net=_in_order(mine.net, theirs.net[charge], order),
            owner=_in_order(mine.owner, theirs.owner[charge], order),
            resistance=_in_order(mine.resistance, theirs.resistance[charge] * charge_share, order),
        ),
        own=OwnTerms(
            head=_head(len(arcs), own.arc, term_arc),
            resistance=_in_order(own.resistance, beside.resistance[term] * term_share, own_order),
            resistance_owner=_in_order(
                own.resistance_owner, beside.resistance_owner[term], own_order
            ),
            capacitance=_in_order(own.capacitance, beside.capacitance[term], own_order),
            capacitance_owner=_in_order(
                own.capacitance_owner, beside.capacitance_owner[term], own_order
            ),
        ),
    )


def _in_order(
    one: NDArray[_Kind], other: NDArray[_Kind], order: NDArray[np.intp]
) -> NDArray[_Kind]:
    return np.concatenate([one, other])[order]


def _head(count: int, *arc: IntArray) -> IntArray:
    """Return where the entries of each arc begin."""
    number = np.bincount(np.concatenate(arc), minlength=count)
    return np.concatenate([[0], np.cumsum(number)]).astype(np.int32)
