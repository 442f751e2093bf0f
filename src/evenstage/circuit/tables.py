"""Gates, their input pins and their arcs in columns: what the numeric rooms work on."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from evenstage.circuit.electrical import Scaled

if TYPE_CHECKING:
    from evenstage.circuit.electrical import Electrical
    from evenstage.circuit.gate import ArcForm, GateForm
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray


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


@dataclass(frozen=True)
class Arcs:
    """Arcs from one input edge to one output edge; shape ``(arcs,)`` each.

    With ``x`` the size of the gate relative to today and ``C`` the capacitance outside the gate, the
    Elmore delay is ``(res.scaling/x + res.fixed) C + own + own_shrinking/x + own_growing x`` (s).

    Parameters
    ----------
    gate, input, output : IntArray
        Gate id; net ids.
    rising : BoolArray
        Whether the output rises (and the input falls).
    resistance : Scaled
        Of the conducting path, ohm, with the stack factor.
    own, own_shrinking, own_growing : FloatArray
        Delay of the gate's own diffusion and inner nodes, s.
    slope, slope_power, shape, shape_carry : FloatArray
        Transition constants of the switching transistor.
    """

    gate: IntArray
    input: IntArray
    output: IntArray
    rising: BoolArray
    resistance: Scaled
    own: FloatArray
    own_shrinking: FloatArray
    own_growing: FloatArray
    slope: FloatArray
    slope_power: FloatArray
    shape: FloatArray
    shape_carry: FloatArray

    @property
    def own_today(self) -> FloatArray:
        """Delay of the gate's own capacitance at today's size, s."""
        return self.own + self.own_shrinking + self.own_growing


_Columns = dict[str, "NDArray[np.float64] | NDArray[np.int32] | NDArray[np.bool_]"]


def pins_of(alike: tuple[AlikeGates, ...], values: Electrical) -> Pins:
    """Collect the pins of all gates, ordered by gate."""
    parts: list[tuple[IntArray, IntArray, IntArray, FloatArray, FloatArray]] = []
    for some in alike:
        columns_of_net: dict[int, list[int]] = {}
        for column, net in enumerate(_drawn(some)):
            if net >= 0:
                columns_of_net.setdefault(net, []).append(column)
        for local, columns in columns_of_net.items():
            members = some.devices[:, columns]
            parts.append(
                (
                    some.gates,
                    some.nets[:, local],
                    np.full(len(some.gates), local, np.int32),
                    values.gate.scaling[members].sum(axis=1),
                    values.gate.fixed[members].sum(axis=1),
                )
            )
    gate, net, local_net, scaling, fixed = _stacked(parts, 5)
    order = np.argsort(gate, kind="stable")
    return Pins(
        gate[order].astype(np.int32),
        net[order].astype(np.int32),
        local_net[order].astype(np.int32),
        Scaled(scaling[order], fixed[order]),
    )


def arcs_of(alike: tuple[AlikeGates, ...], values: Electrical, node_cap: FloatArray) -> Arcs:
    """Collect the arcs of all gates, ordered by gate.

    Parameters
    ----------
    alike : tuple of AlikeGates
    values : Electrical
    node_cap : FloatArray, F, shape (nets,)
        Capacitor cards on each net; on inner nodes they belong to the gate.
    """
    parts = [part for some in alike for part in _arcs_of_form(some, values, node_cap)]
    gate, source, output, rising, r_x, r_0, own, small, large, *shape = _stacked(parts, 13)
    order = np.argsort(gate, kind="stable")
    slope, power, form, carry = (column[order] for column in shape)
    return Arcs(
        gate=gate[order].astype(np.int32),
        input=source[order].astype(np.int32),
        output=output[order].astype(np.int32),
        rising=rising[order].astype(bool),
        resistance=Scaled(r_x[order], r_0[order]),
        own=own[order],
        own_shrinking=small[order],
        own_growing=large[order],
        slope=slope,
        slope_power=power,
        shape=form,
        shape_carry=carry,
    )


def _drawn(some: AlikeGates) -> list[int]:
    """Return the local net on each drawn device's gate (negative: a supply)."""
    return [switch.gate for switch in some.form.drawn]


def _stacked(parts: list[tuple[FloatArray, ...]] | list, count: int) -> list[FloatArray]:  # type: ignore[type-arg]
    """Concatenate parts column by column."""
    if not parts:
        return [np.zeros(0) for _ in range(count)]
    return [np.concatenate(column) for column in zip(*parts, strict=True)]


def _arcs_of_form(
    some: AlikeGates, values: Electrical, node_cap: FloatArray
) -> list[tuple[FloatArray, ...]]:
    """Return the columns of every arc of one form, for all its gates at once."""
    network = some.form.network
    res = _switch_resistance(some, values)
    cap = _node_capacitance(some, values, node_cap)
    first_device = [network.switch_of_device.index(i) for i in range(len(network.switches))]
    return [_arc_columns(some, arc, res, cap, values, first_device) for arc in some.form.arcs]


def _arc_columns(
    some: AlikeGates,
    arc: ArcForm,
    res: Scaled,
    cap: Scaled,
    values: Electrical,
    first_device: list[int],
) -> tuple[FloatArray, ...]:
    form = some.form
    stack = values.stack[some.devices[:, [first_device[i] for i in arc.path]]]
    factor = (1 + stack * (len(arc.path) - 1)) / len(arc.path)
    # Cumulated from the supply: entry d is the resistance of the last d switches of the path.
    towards = list(reversed(arc.path))
    r_x = np.cumsum(res.scaling[:, towards] * factor[:, ::-1], axis=1)
    r_0 = np.cumsum(res.fixed[:, towards] * factor[:, ::-1], axis=1)
    rows = {node: row for row, node in enumerate(form.network.inner_nodes)}
    nodes = [rows[node] for node, _ in arc.moved]
    depth = [count - 1 for _, count in arc.moved]
    switching = next(i for i in arc.path if form.network.switches[i].gate == arc.input)
    device = some.devices[:, first_device[switching]]
    both = r_x[:, depth] * cap.scaling[:, nodes] + r_0[:, depth] * cap.fixed[:, nodes]
    ones = np.ones(len(some.gates))
    return (
        some.gates,
        some.nets[:, arc.input],
        some.nets[:, form.output],
        ones * arc.rising,
        r_x[:, -1],
        r_0[:, -1],
        both.sum(axis=1),
        (r_x[:, depth] * cap.fixed[:, nodes]).sum(axis=1),
        (r_0[:, depth] * cap.scaling[:, nodes]).sum(axis=1),
        values.slope[device],
        values.slope_power[device],
        values.shape[device],
        values.shape_carry[device],
    )


def _switch_resistance(some: AlikeGates, values: Electrical) -> Scaled:
    """Return the resistance of each merged switch, shape ``(k, switches)``: fingers in parallel."""
    network = some.form.network
    member = _incidence(network.switch_of_device, len(network.switches))
    scaling = 1.0 / ((1.0 / values.resistance.scaling[some.devices]) @ member)
    fixed = values.resistance.fixed[some.devices]
    conductance = np.divide(1.0, fixed, out=np.zeros_like(fixed), where=fixed > 0) @ member
    inverse = np.divide(1.0, conductance, out=np.zeros_like(conductance), where=conductance > 0)
    return Scaled(scaling, inverse)


def _node_capacitance(some: AlikeGates, values: Electrical, node_cap: FloatArray) -> Scaled:
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
    drain, source = values.drain, values.source
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
