"""Arcs and pins of stages in columns, one owner for each part."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import csr_array

from evenstage.circuit.arcs import NO_OWNER, Arcs, Charges, OwnTerms
from evenstage.circuit.electrical import Scaled
from evenstage.circuit.gate_arcs import switch_resistance
from evenstage.circuit.stage_plan import Present, crowded, parts_at, plan
from evenstage.circuit.tables import Pins

if TYPE_CHECKING:
    from evenstage.circuit.electrical import Diffusion, Electrical
    from evenstage.circuit.stage_form import StageForm
    from evenstage.circuit.stage_plan import Capacitor, Resistor, Sums
    from evenstage.netlist.devices import FloatArray, IntArray

WEAK = 2.0
"""Resistance of an n transistor that passes a high level, or a p transistor a low one, relative to
its own in the other direction (Weste and Harris, CMOS VLSI Design, 4th ed. 2011, section 4.3, from
memory)."""


@dataclass(frozen=True)
class AlikeStages:
    """All stages of one form.

    Parameters
    ----------
    form : StageForm
    gates : IntArray, shape (k, parts)
        Gate id of each part.
    devices : IntArray, shape (k, devices of a stage)
    nets : IntArray, shape (k, local nets)
    """

    form: StageForm
    gates: IntArray
    devices: IntArray
    nets: IntArray


def stage_arcs(some: AlikeStages, values: Electrical, drive: FloatArray) -> Arcs:
    """Return the arcs of stages of one form, stage by stage.

    Parameters
    ----------
    some : AlikeStages
    values : Electrical
    drive : FloatArray, ohm, shape (nets,)
        Resistance of what drives each net from outside.
    """
    form, count = some.form, len(some.gates)
    present = Present(
        bool(values.resistance.fixed[some.devices].any()),
        any(bool(end.fixed[some.devices].any()) for end in _ends(values)),
        bool(drive[some.nets[:, list(form.sources)]].any()),
    )
    sums = plan(form, present)
    resistance = _vector_of_resistances(some, values, drive, sums.resistors)
    capacitance = _vector_of_capacitances(some, values, sums.capacitors)
    # The last column is that of what has no owner.
    gates = np.column_stack([some.gates, np.full(count, NO_OWNER, np.int32)])
    whole = _summed(sums.whole, resistance)
    moved = _summed(sums.own, resistance, capacitance)
    switching = np.array([arc.switching for arc in form.arcs])
    device = some.devices[:, form.network.first_devices[np.maximum(switching, 0)]].ravel()
    # What the outside drives arrives with its own transition and meets no threshold.
    outside = np.tile(switching < 0, count)
    arcs = form.arcs
    more = np.tile([len(arc.steps) - 1 for arc in arcs], count)
    return Arcs(
        gate=gates[:, [arc.part for arc in arcs]].ravel(),
        input=some.nets[:, [arc.input for arc in arcs]].ravel(),
        output=some.nets[:, [arc.output for arc in arcs]].ravel(),
        rising=np.tile([arc.rising for arc in arcs], count),
        input_rising=np.tile([arc.input_rising for arc in arcs], count),
        charges=Charges(
            head=_head(sums.charges, count),
            net=some.nets[:, sums.charges.other].ravel(),
            owner=gates[:, sums.charges.owner].ravel(),
            resistance=_summed(sums.charges, resistance).ravel(),
        ),
        own=OwnTerms(
            head=_head(sums.own, count),
            resistance=whole.ravel(),
            resistance_owner=gates[:, sums.own.owner].ravel(),
            capacitance=np.divide(moved, whole, out=np.zeros_like(moved), where=whole > 0).ravel(),
            capacitance_owner=gates[:, sums.own.other].ravel(),
        ),
        slope=np.where(outside, 0.0, values.slope[device] * values.slope_in_stack(device, more)),
        slope_power=np.where(outside, 1.0, values.slope_power[device]),
        shape=values.shape[device] * values.shape_in_stack(device, more),
        shape_carry=np.where(outside, 1.0, values.shape_carry[device]),
    )


def stage_pins(some: AlikeStages, values: Electrical) -> list[Pins]:
    """Return what the channels of stages of one form put on nets that the outside drives.

    And on nets that very many parts share.
    """
    found = []
    for node in dict.fromkeys((*some.form.sources, *crowded(some.form))):
        for part in parts_at(some.form).get(node, ()):
            at = [_columns_at(some.form, node, part, end) for end in (0, 1)]
            if any(at):
                cap = _mean_at(some, values, at)
                net = some.nets[:, node]
                local = np.full(len(net), node, np.int32)
                found.append(Pins(some.gates[:, part], net, local, cap))
    return found


def _mean_at(some: AlikeStages, values: Electrical, at: list[list[int]]) -> Scaled:
    """Return the diffusion of some drains and sources over both edges, shape (k,)."""
    drain, source = values.drain, values.source
    a, b = some.devices[:, at[0]], some.devices[:, at[1]]
    return Scaled(
        drain.scaling[a].sum(axis=1) + source.scaling[b].sum(axis=1),
        drain.fixed[a].sum(axis=1) + source.fixed[b].sum(axis=1),
    )


def _columns_at(form: StageForm, node: int, part: int, end: int) -> list[int]:
    """Return the devices of a part whose drain (0) or source (1) is on a node."""
    nets = [(form.drawn[c].a, form.drawn[c].b)[end] for c in form.columns[part]]
    return [
        column
        for column, net in zip(form.columns[part], nets, strict=True)
        if net >= 0 and form.network.node_of_net[net] == node
    ]


def _ends(values: Electrical) -> tuple[Scaled, ...]:
    return values.rise.drain, values.rise.source, values.fall.drain, values.fall.source


def _vector_of_resistances(
    some: AlikeStages, values: Electrical, drive: FloatArray, resistors: tuple[Resistor, ...]
) -> FloatArray:
    """Return the resistance of every entry, ohm, shape (k, entries)."""
    form = some.form
    of_switch = switch_resistance(form.network, some.devices, values)
    stack = values.stack[some.devices[:, form.network.first_devices]]
    return np.column_stack(
        [
            drive[some.nets[:, one.source]]
            if one.source >= 0
            else _in_parallel(form, of_switch, one) * (_in_series(stack, one) * one.factor)
            for one in resistors
        ]
    )


def _in_parallel(form: StageForm, of_switch: Scaled, one: Resistor) -> FloatArray:
    """Return the resistance of a step's switches, those that pass weakly with more."""
    resistance = of_switch.scaling if one.scales else of_switch.fixed
    parts = [
        resistance[:, i] * (WEAK if (form.network.switches[i].polarity == "n") == one.rising else 1)
        for i in one.switches
    ]
    if len(parts) == 1:
        return parts[0]
    conductance = np.zeros_like(parts[0])
    for part in parts:
        conductance += np.divide(1.0, part, out=np.zeros_like(part), where=part > 0)
    return np.divide(1.0, conductance, out=np.zeros_like(conductance), where=conductance > 0)


def _in_series(stack: FloatArray, one: Resistor) -> FloatArray:
    """Return the factor of one of several steps in series."""
    result: FloatArray = (1 + stack[:, one.switches[0]] * (one.series - 1)) / one.series
    return result


def _vector_of_capacitances(
    some: AlikeStages, values: Electrical, capacitors: tuple[Capacitor, ...]
) -> FloatArray:
    """Return the capacitance of every entry, F, shape (k, entries)."""
    columns, first = [], some.form.network.first_devices
    for one in capacitors:
        edge: Diffusion = values.rise if one.rising else values.fall
        total = np.zeros(len(some.gates))
        for end, quantity in enumerate((edge.drain, edge.source)):
            at = some.devices[:, _columns_at(some.form, one.node, one.part, end)]
            total += (quantity.scaling if one.scales else quantity.fixed)[at].sum(axis=1)
        if one.behind >= 0:
            total *= values.weak_swing[some.devices[:, first[one.behind]]]
        columns.append(total)
    return np.column_stack(columns)


def _summed(
    sums: Sums, resistance: FloatArray, capacitance: FloatArray | None = None
) -> FloatArray:
    """Return the sum of each row, shape (k, rows)."""
    entries = len(sums.row)
    adding = csr_array(
        (np.ones(entries), (sums.row, np.arange(entries))), shape=(len(sums.owner), entries)
    )
    product = resistance[:, sums.resistor]
    if capacitance is not None:
        product = product * capacitance[:, sums.capacitor]
    return np.ascontiguousarray(np.asarray(adding @ product.T).T)


def _head(sums: Sums, count: int) -> IntArray:
    """Return where the rows of each arc begin, stage after stage."""
    return np.concatenate([[0], np.cumsum(np.tile(sums.count, count))]).astype(np.int32)
