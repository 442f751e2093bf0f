"""Gates and their input pins in columns, and the arcs of plain gates."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, TypeVar

import numpy as np

from evenstage.circuit.arcs import NO_OWNER, Arcs, joined, uniform
from evenstage.circuit.electrical import Scaled

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from evenstage.circuit.electrical import Diffusion, Electrical
    from evenstage.circuit.gate import ArcForm, GateForm
    from evenstage.circuit.network import Network
    from evenstage.netlist.devices import FloatArray, IntArray

CONTENTION_MAX = 20.0
"""Most that a load may slow the edge against it: beyond, the output hardly moves."""

_Kind = TypeVar("_Kind", bound=np.generic)


@dataclass(frozen=True)
class AlikeGates:
    """All gates of one form.

    Parameters
    ----------
    form : GateForm
    gates : IntArray, shape (k,)
        Gate ids, ascending.
    devices : IntArray, shape (k, devices of a gate)
    nets : IntArray, shape (k, local nets)
    """

    form: GateForm
    gates: IntArray
    devices: IntArray
    nets: IntArray


@dataclass(frozen=True)
class Pins:
    """Input pins, one per gate and net; capacitance of all the gate's transistors on that net, F.

    Shape ``(pins,)``; ``local`` is the pin's local net in the gate's form.
    """

    gate: IntArray
    net: IntArray
    local: IntArray
    cap: Scaled


def pins_of(alike: tuple[AlikeGates, ...], values: Electrical, more: Sequence[Pins] = ()) -> Pins:
    """Collect the pins of all gates, ordered by gate.

    Parameters
    ----------
    alike : tuple of AlikeGates
        At least one.
    values : Electrical
    more : sequence of Pins
        Channels that load nets from outside.
    """
    parts = [*(part for some in alike for part in _pins_of_form(some, values)), *more]
    order = np.argsort(np.concatenate([part.gate for part in parts]), kind="stable")
    return Pins(
        gate=_joined([part.gate for part in parts], order),
        net=_joined([part.net for part in parts], order),
        local=_joined([part.local for part in parts], order),
        cap=_joined_scaled([part.cap for part in parts], order),
    )


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


def _joined(columns: Sequence[NDArray[_Kind]], order: NDArray[np.intp]) -> NDArray[_Kind]:
    """Put the columns of several tables under each other, then in order."""
    return np.concatenate(columns)[order]


def _joined_scaled(columns: Sequence[Scaled], order: NDArray[np.intp]) -> Scaled:
    return Scaled(
        _joined([column.scaling for column in columns], order),
        _joined([column.fixed for column in columns], order),
    )


def _pins_of_form(some: AlikeGates, values: Electrical) -> list[Pins]:
    """Return one table per input of a form, for all its gates."""
    columns_of_net: dict[int, list[int]] = {}
    for column, switch in enumerate(some.form.drawn):
        if switch.gate >= 0:
            columns_of_net.setdefault(switch.gate, []).append(column)
    return [
        Pins(
            gate=some.gates,
            net=some.nets[:, local],
            local=np.full(len(some.gates), local, np.int32),
            cap=Scaled(
                values.gate.scaling[some.devices[:, columns]].sum(axis=1),
                values.gate.fixed[some.devices[:, columns]].sum(axis=1),
            ),
        )
        for local, columns in columns_of_net.items()
    ]


def _arcs_of_form(some: AlikeGates, values: Electrical, node_cap: FloatArray) -> list[Arcs]:
    """Return one table per arc of a form, for all its gates."""
    network = some.form.network
    res = switch_resistance(network, some.devices, values)
    fall = _node_capacitance(some, values.fall, node_cap)
    alike = values.rise is values.fall
    rise = fall if alike else _node_capacitance(some, values.rise, node_cap)
    first_device = [network.switch_of_device.index(i) for i in range(len(network.switches))]
    return [
        _alike_arcs(some, arc, values, (res, rise if arc.rising else fall), first_device)
        for arc in some.form.arcs
    ]


def _alike_arcs(
    some: AlikeGates,
    arc: ArcForm,
    values: Electrical,
    parts: tuple[Scaled, Scaled],
    first_device: list[int],
) -> Arcs:
    """Return one arc of a form for all its gates.

    The parts are the resistance of each switch and the capacitance of each node.
    """
    form, (res, cap) = some.form, parts
    stack = values.stack[some.devices[:, [first_device[i] for i in arc.path]]]
    more = len(arc.path) - 1
    factor = (1 + stack * more) / len(arc.path)
    # Cumulated from the supply: entry d is the resistance of the last d + 1 switches of the path.
    towards = list(reversed(arc.path))
    r_x = np.cumsum(res.scaling[:, towards] * factor[:, ::-1], axis=1)
    r_0 = np.cumsum(res.fixed[:, towards] * factor[:, ::-1], axis=1)
    if arc.load:
        fight = _contention(r_x[:, -1] + r_0[:, -1], res.today[:, list(arc.load)].sum(axis=1))
        r_x, r_0 = r_x * fight[:, None], r_0 * fight[:, None]
    rows = {node: row for row, node in enumerate(form.network.inner_nodes)}
    nodes = [rows[node] for node, _ in arc.moved]
    depth = [count - 1 for _, count in arc.moved]
    part = _counted(some, arc, values, first_device)
    c_x, c_0 = part * cap.scaling[:, nodes], part * cap.fixed[:, nodes]
    # A load that has been overpowered is not switched: the edge through it begins in the network.
    switching = next(
        (i for i in arc.path if form.network.switches[i].gate == arc.input), arc.path[0]
    )
    device = some.devices[:, first_device[switching]]
    scaling, fixed = r_x[:, -1], r_0[:, -1]
    net = some.nets[:, form.output]
    none = np.full(len(net), NO_OWNER, np.int32)
    charges = [(net, some.gates, scaling)]
    terms = [(scaling, some.gates, (r_x[:, depth] * c_x).sum(axis=1) / scaling, some.gates)]
    # What is zero for all of them is left out; what does not scale is so at any width.
    if c_0.any():
        terms.append((scaling, some.gates, (r_x[:, depth] * c_0).sum(axis=1) / scaling, none))
    if fixed.any():
        whole = np.where(fixed > 0, fixed, 1.0)
        charges.append((net, none, fixed))
        terms.append((fixed, none, (r_0[:, depth] * c_x).sum(axis=1) / whole, some.gates))
        if c_0.any():
            terms.append((fixed, none, (r_0[:, depth] * c_0).sum(axis=1) / whole, none))
    charged, own = uniform(len(net), charges, terms)
    return Arcs(
        gate=some.gates,
        input=some.nets[:, arc.input],
        output=net,
        rising=np.full(len(net), arc.rising),
        input_rising=np.full(len(net), not arc.rising),
        charges=charged,
        own=own,
        slope=values.slope[device] / (1 + values.slope_stack[device] * more),
        slope_power=values.slope_power[device],
        shape=values.shape[device] / (1 + values.shape_stack[device] * more),
        shape_carry=values.shape_carry[device],
    )


def _counted(
    some: AlikeGates, arc: ArcForm, values: Electrical, first_device: list[int]
) -> FloatArray:
    """Return which part of each moved node counts, shape ``(k, moved)`` or ``(1, moved)``."""
    if not arc.behind:
        return np.ones((1, len(arc.moved)))
    part = np.ones((len(some.gates), len(arc.moved)))
    column = {node: column for column, (node, _) in enumerate(arc.moved)}
    for node, switch in arc.behind:
        part[:, column[node]] = values.weak_swing[some.devices[:, first_device[switch]]]
    return part


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
