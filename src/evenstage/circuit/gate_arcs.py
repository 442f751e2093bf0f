"""The arcs of plain gates: resistances along their paths, capacitances that move with the output.

All gates of a form are worked out side by side; they are the last axis of every array here.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple, TypeVar

import numpy as np

from evenstage.circuit.arc_plan import NOTHING
from evenstage.circuit.arcs import NO_OWNER, Arcs, Charges, OwnTerms, joined
from evenstage.circuit.electrical import Scaled

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from evenstage.circuit.arc_plan import ArcPlan
    from evenstage.circuit.electrical import Diffusion, Electrical
    from evenstage.circuit.network import BoolArray, Network
    from evenstage.circuit.tables import AlikeGates
    from evenstage.netlist.devices import FloatArray, IntArray

_Kind = TypeVar("_Kind", bound=np.generic)

CONTENTION_MAX = 20.0
"""Most that a load may slow the edge against it: beyond, the output hardly moves."""


def arcs_of(alike: Sequence[AlikeGates], values: Electrical, node_cap: FloatArray) -> Arcs:
    """Collect the arcs of all gates, ordered by gate.

    Parameters
    ----------
    alike : sequence of AlikeGates
        At least one with arcs.
    values : Electrical
    node_cap : FloatArray, F, shape (nets,)
        Capacitor cards on each net; on inner nodes they belong to the gate.
    """
    with_arcs = [some for some in alike if some.form.arcs]
    return joined([part for some in with_arcs for part in _arcs_of_form(some, values, node_cap)])


def _arcs_of_form(some: AlikeGates, values: Electrical, node_cap: FloatArray) -> list[Arcs]:
    """Return the arcs of a form for all its gates, arc by arc, in tables of bounded size."""
    res = switch_resistance(some.form.network, some.devices, values)
    fall = _node_capacitance(some, values.fall, node_cap)
    alike = values.rise is values.fall
    rise = fall if alike else _node_capacitance(some, values.rise, node_cap)
    return [_planned_arcs(some, plan, values, res, (fall, rise)) for plan in some.plans]


def _planned_arcs(
    some: AlikeGates,
    plan: ArcPlan,
    values: Electrical,
    res: Scaled,
    caps: tuple[Scaled, Scaled],
) -> Arcs:
    """Return some arcs of a form for all its gates.

    Resistances of switches, capacitances of nodes for a falling and a rising output.
    """
    arcs, count = len(plan.arcs), len(some.gates)
    device = some.devices.T[some.form.network.first_devices]
    charges, own = _sums(
        some, plan, _along_paths(plan, values, res, device), _at_nodes(plan, values, caps, device)
    )
    switching = device[plan.switching].ravel()
    more = np.repeat(plan.length[:arcs] - 1, count)
    rising = np.repeat(plan.rising, count)
    return Arcs(
        gate=np.tile(some.gates, arcs),
        input=some.nets.T[[arc.input for arc in plan.arcs]].ravel(),
        output=np.tile(some.nets[:, some.form.output], arcs),
        rising=rising,
        input_rising=~rising,
        charges=charges,
        own=own,
        slope=values.slope[switching] * values.slope_in_stack(switching, more),
        slope_power=values.slope_power[switching],
        shape=values.shape[switching] * values.shape_in_stack(switching, more),
        shape_carry=values.shape_carry[switching],
    )


class _Term(NamedTuple):
    """A term of an Elmore delay: which arcs have it, shape (arcs,), and its columns (arcs, k)."""

    has: BoolArray
    resistance: FloatArray
    resistance_owner: IntArray
    capacitance: FloatArray
    capacitance_owner: IntArray


def _sums(
    some: AlikeGates,
    plan: ArcPlan,
    along: tuple[FloatArray, FloatArray],
    cap: tuple[FloatArray, FloatArray],
) -> tuple[Charges, OwnTerms]:
    """Return what arcs charge outside and inside: products of what scales and of what stays.

    Resistances along the paths and capacitances of the moved nodes, what scales first.
    """
    arcs, count = len(plan.arcs), len(some.gates)
    owners = [
        np.broadcast_to(own, (arcs, count)) for own in (some.gates, np.full(1, NO_OWNER, np.int32))
    ]
    terms = []
    for r, r_owner in zip(along, owners, strict=True):
        whole = r[:arcs, -1]
        # What is zero for all of them is left out; what does not scale is so at any width.
        stays: BoolArray = np.asarray(whole.any(axis=1))
        if not stays.any():
            continue
        at_step = r.reshape(-1, count)[plan.step]
        for c, c_owner in zip(cap, owners, strict=True):
            moved = plan.added(at_step * c) if c.any() else np.zeros_like(whole)
            has = stays if c_owner is owners[0] else stays & moved.any(axis=1)
            part = np.divide(moved, whole, out=np.zeros_like(moved), where=whole > 0)
            terms.append(_Term(has, whole, r_owner, part, c_owner))
    terms = [term for term in terms if term.has.any()]
    outside = [term for term in terms if term.capacitance_owner is owners[0]]
    has_charge = np.stack([term.has for term in outside], axis=1)
    has_term = np.stack([term.has for term in terms], axis=1)
    charge_head, own_head = (_head(has, count) for has in (has_charge, has_term))
    net = np.tile(some.nets[:, some.form.output], arcs)
    return Charges(
        head=charge_head,
        net=np.repeat(net, np.diff(charge_head)),
        owner=_interleaved(has_charge, [term.resistance_owner for term in outside]),
        resistance=_interleaved(has_charge, [term.resistance for term in outside]),
    ), OwnTerms(
        head=own_head,
        resistance=_interleaved(has_term, [term.resistance for term in terms]),
        resistance_owner=_interleaved(has_term, [term.resistance_owner for term in terms]),
        capacitance=_interleaved(has_term, [term.capacitance for term in terms]),
        capacitance_owner=_interleaved(has_term, [term.capacitance_owner for term in terms]),
    )


def _head(has: BoolArray, count: int) -> IntArray:
    """Return where the entries of each arc of each gate begin, arc by arc."""
    each = np.repeat(has.sum(axis=1), count)
    return np.concatenate([[0], np.cumsum(each)]).astype(np.int32)


def _interleaved(has: BoolArray, columns: Sequence[NDArray[_Kind]]) -> NDArray[_Kind]:
    """Put columns of several terms, shape (arcs, k) each, into one list, arc by arc.

    Only terms that an arc has: ``has``, shape (arcs, terms).
    """
    if len(columns) == 1 and has.all():
        return columns[0].ravel()
    stacked = np.stack(columns, axis=2)
    return stacked[np.broadcast_to(has[:, None, :], stacked.shape)]


def _along_paths(
    plan: ArcPlan, values: Electrical, res: Scaled, device: IntArray
) -> tuple[FloatArray, FloatArray]:
    """Return the resistance from the supply to each place of each path, shape (paths, longest, k).

    What scales, and what stays; ``device`` is the first device of each switch. Beyond a path's end
    its whole resistance goes on. Of paths side by side the whole is that of all together, and a
    node with some part of its path's resistance before it has that part of the whole: what a
    current into the output raises the node by, a current into the node raises the output by.
    """
    length = plan.length[:, None, None]
    factor = (1 + values.stack[device][plan.path] * (length - 1)) / length
    factor[plan.path == NOTHING] = 0.0
    scaling, fixed = (
        np.cumsum(np.ascontiguousarray(part.T)[plan.path] * factor, axis=1)
        if part.any()
        else np.zeros(factor.shape)
        for part in (res.scaling, res.fixed)
    )
    for arc, beside in zip(plan.arcs, plan.beside, strict=True):
        rows = list(beside)
        if len(rows) > 1:
            for part in (scaling, fixed):
                part[rows] *= _share_of_current(part[rows, -1])[:, None]
        if arc.load:
            pull = scaling[rows[0], -1] + fixed[rows[0], -1]
            fight = _contention(pull, res.today[:, list(arc.load)].sum(axis=1))
            scaling[rows] *= fight
            fixed[rows] *= fight
    return scaling, fixed


def _share_of_current(resistance: FloatArray) -> FloatArray:
    """Return which part of a current flows through each of some paths, shape (paths, k)."""
    if not resistance.all():
        return np.full_like(resistance, 1 / len(resistance))
    conductance = 1 / resistance
    share: FloatArray = conductance / conductance.sum(axis=0)
    return share


def _at_nodes(
    plan: ArcPlan, values: Electrical, caps: tuple[Scaled, Scaled], device: IntArray
) -> tuple[FloatArray, FloatArray]:
    """Return the capacitance of each moved node, shape (moved nodes of all arcs, k).

    What scales, and what stays, as far as it moves.
    """
    fall, rise = caps
    scaling, fixed = (
        np.ascontiguousarray(part.T)[plan.node] for part in (fall.scaling, fall.fixed)
    )
    if rise is not fall:
        up = plan.rising[plan.of_arc]
        scaling[up] = rise.scaling.T[plan.node[up]]
        fixed[up] = rise.fixed.T[plan.node[up]]
    weak = np.flatnonzero(plan.behind != NOTHING)
    part = values.weak_swing[device[plan.behind[weak]]]
    scaling[weak] *= part
    fixed[weak] *= part
    return scaling, fixed


def _contention(pull: FloatArray, load: FloatArray) -> FloatArray:
    """Return by how much a load slows a pull: the difference of the conductances drives.

    ``1 / R = 1 / pull - 1 / load``; both change together with the size of the gate. A load as
    strong as the pull would leave nothing, and a notice says so; here `CONTENTION_MAX` is kept.
    """
    return 1 / np.maximum(1 - pull / load, 1 / CONTENTION_MAX)


def switch_resistance(network: Network, devices: IntArray, values: Electrical) -> Scaled:
    """Return the resistance of each merged switch, shape ``(k, switches)``: fingers in parallel.

    What scales and what stays are put in parallel apart, so that the sum keeps its form when the
    gate grows. That is exact for equal fingers; unequal ones with fixed parts come out a little low
    (fingers of 1 and 3 widths whose fixed parts are a tenth of the narrow one: by 3 %).
    """
    member = _incidence(network.switch_of_device, len(network.switches))
    scaling = 1.0 / ((1.0 / values.resistance.scaling[devices]) @ member)
    fixed = values.resistance.fixed[devices]
    if not fixed.any():
        return Scaled(scaling, np.broadcast_to(0.0, scaling.shape))
    conductance = np.divide(1.0, fixed, out=np.zeros_like(fixed), where=fixed > 0) @ member
    inverse = np.divide(1.0, conductance, out=np.zeros_like(conductance), where=conductance > 0)
    return Scaled(scaling, inverse)


def _node_capacitance(some: AlikeGates, ends: Diffusion, node_cap: FloatArray) -> Scaled:
    """Return the capacitance of each inner node, output included, shape ``(k, nodes)``.

    Drains and sources of all the gate's devices; on inner nodes capacitor cards too (on the output
    they are outside the gate).
    """
    form = some.form
    rows = {node: row for row, node in enumerate(form.network.inner_nodes)}
    row_of_net = [rows.get(node, -1) for node in form.network.node_of_net]
    at_drain = _incidence([row_of_net[s.a] if s.a >= 0 else -1 for s in form.drawn], len(rows))
    at_source = _incidence([row_of_net[s.b] if s.b >= 0 else -1 for s in form.drawn], len(rows))
    inner = [-1 if net == form.output else row for net, row in enumerate(row_of_net)]
    wires = node_cap[some.nets] @ _incidence(inner, len(rows))
    drain, source = ends.drain, ends.source
    return Scaled(
        drain.scaling[some.devices] @ at_drain + source.scaling[some.devices] @ at_source,
        drain.fixed[some.devices] @ at_drain + source.fixed[some.devices] @ at_source + wires,
    )


def _incidence(column_of_row: list[int] | tuple[int, ...], columns: int) -> FloatArray:
    """Return a 0/1 matrix with a one at each row's column, none where the column is -1."""
    rows = np.flatnonzero(np.array(column_of_row, int) >= 0)
    matrix = np.zeros((len(column_of_row), columns))
    matrix[rows, np.array(column_of_row, int)[rows]] = 1.0
    return matrix
