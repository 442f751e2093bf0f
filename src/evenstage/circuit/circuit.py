"""The recognised block: gates, pins, arcs, loads, and a graph of them."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import TYPE_CHECKING

import networkx as nx
import numpy as np

from evenstage.circuit.capacitance import at_nets, capacitor_values, on_nets, on_nodes
from evenstage.circuit.electrical import Electrical, electrical
from evenstage.circuit.evaluation import evaluate_circuit, net_function
from evenstage.circuit.function import inverted_text, text
from evenstage.circuit.names import Names
from evenstage.circuit.opening import arcs_with_stages
from evenstage.circuit.stage_tables import AlikeStages, stage_pins
from evenstage.circuit.tables import AlikeGates, Pins, pins_of
from evenstage.circuit.wiring import WireLoads, wire_loads

if TYPE_CHECKING:
    from collections.abc import Mapping

    from numpy.typing import ArrayLike

    from evenstage.circuit.apart import Apart
    from evenstage.circuit.arcs import Arcs
    from evenstage.circuit.evaluation import NetFunction, NetValues
    from evenstage.circuit.network import BoolArray
    from evenstage.circuit.storage.elements import Storage
    from evenstage.circuit.supplies import Supplies
    from evenstage.circuit.wiring import Wiring
    from evenstage.errors import Notice
    from evenstage.netlist.devices import Devices, FloatArray, IntArray
    from evenstage.process.process import Process

NET = "net"
"""Edge attribute of `Circuit.graph`: id of the net that joins two gates."""
STORED = "stored"
"""Why paths end at a net of `Circuit.ends` where a storage element takes data in."""
OUTPUT = "output"
"""Node attribute of `Circuit.graph`: id of the net a gate drives."""


@dataclass(frozen=True, slots=True)
class NotUnderstood:
    """Channel-connected groups drawn alike that are no known kind of gate.

    Parameters
    ----------
    devices : IntArray, shape (groups, devices of a group)
        Device ids.
    reason : str
        Why not.
    """

    devices: IntArray
    reason: str


@dataclass(frozen=True, kw_only=True)
class Circuit:
    """Gates of a block in a process.

    Gates are numbered by their first device. Arrays are read-only; `resized` returns a new circuit.

    Parameters
    ----------
    devices : Devices
    process : Process
        With its unit inverter filled in.
    supplies : Supplies
    alike : tuple of AlikeGates
        Gates by form; every gate in exactly one.
    stages : tuple of AlikeStages
        Groups that are several gates; their arcs run through more than one.
    drive : FloatArray, ohm, shape (nets,)
        Resistance of what drives each net from outside.
    not_understood : tuple of NotUnderstood
    apart : tuple of Apart
        Devices outside all logic (decoupling, dummies, ties): they only load their nets.
    storage : Storage
        Loops of nets: storage elements, and loops that are none.
    outside_cap : FloatArray, F, shape (nets,)
        What the brief, or the default of four unit inverters, hangs on outputs.
    gate_output : IntArray, shape (gates,)
        Net ids.
    gate_instance : IntArray, shape (gates,)
        Innermost instance that holds all transistors of the gate.
    gate_is_leaf : BoolArray, shape (gates,)
        Whether that instance holds nothing else.
    ends : dict of int to str
        Nets where paths end, and why.
    notices : tuple of Notice
    coupling : float
        What a capacitor between two signals counts on each of them.
    wiring : Wiring, optional
        Nets with resistance; None where there are none.
    """

    devices: Devices
    process: Process
    supplies: Supplies
    alike: tuple[AlikeGates, ...] = field(repr=False)
    stages: tuple[AlikeStages, ...] = field(repr=False)
    drive: FloatArray = field(repr=False)
    not_understood: tuple[NotUnderstood, ...]
    apart: tuple[Apart, ...] = field(repr=False)
    storage: Storage = field(repr=False)
    outside_cap: FloatArray = field(repr=False)
    gate_output: IntArray = field(repr=False)
    gate_instance: IntArray = field(repr=False)
    gate_is_leaf: BoolArray = field(repr=False)
    ends: dict[int, str]
    notices: tuple[Notice, ...]
    coupling: float = 1.0
    wiring: Wiring | None = field(default=None, repr=False)

    def __len__(self) -> int:
        return len(self.gate_output)

    @cached_property
    def electrical(self) -> Electrical:
        """Resistance and capacitance of every device."""
        return electrical(self.devices, self.process)

    @cached_property
    def capacitor_value(self) -> FloatArray:
        """What each capacitor card counts for at its ends, F, shape (capacitors,)."""
        return capacitor_values(self.devices, self.supplies.is_supply, self.coupling)

    @cached_property
    def wire_cap(self) -> FloatArray:
        """Capacitor cards on each net, F, shape (nets,)."""
        return on_nets(self.devices, self.capacitor_value)

    @cached_property
    def wire_loads(self) -> WireLoads | None:
        """What the wires amount to; None where no net has resistance."""
        wires = self.devices.wires
        if self.wiring is None or wires is None:
            return None
        cap = on_nodes(wires, self.electrical, self.capacitor_value, self.outside_cap)
        return wire_loads(self.wiring, cap)

    @cached_property
    def strange_cap(self) -> FloatArray:
        """Gates of transistors that were not understood, F, shape (nets,)."""
        strange = _joined([some.devices.ravel() for some in self.not_understood])
        cap = self.electrical.gate.today[strange]
        return at_nets(self.devices.gate[strange], cap, len(self.devices.net_names))

    @cached_property
    def apart_cap(self) -> FloatArray:
        """Gates, drains and sources of transistors outside all logic, F, shape (nets,)."""
        which, nets = _joined([some.devices for some in self.apart]), len(self.devices.net_names)
        values, devices = self.electrical, self.devices
        return (
            at_nets(devices.gate[which], values.gate.today[which], nets)
            + at_nets(devices.drain[which], values.drain.today[which], nets)
            + at_nets(devices.source[which], values.source.today[which], nets)
        )

    @cached_property
    def fixed_cap(self) -> FloatArray:
        """Everything outside recognised gates that loads a net, F, shape (nets,)."""
        return self.wire_cap + self.apart_cap + self.strange_cap + self.outside_cap

    @cached_property
    def pins(self) -> Pins:
        """Input pins of all gates."""
        channels = [pins for some in self.stages for pins in stage_pins(some, self.electrical)]
        return pins_of(self.alike, self.electrical, channels)

    @cached_property
    def _pins_by_net(self) -> tuple[IntArray, IntArray]:
        """Pins by net, then by gate, and where those of each net begin."""
        order = np.lexsort((self.pins.gate, self.pins.net)).astype(np.int32)
        nets = np.arange(len(self.devices.net_names) + 1)
        return order, np.searchsorted(self.pins.net[order], nets)

    def pins_on(self, net: int) -> IntArray:
        """Return the pins on a net, by gate."""
        order, head = self._pins_by_net
        return order[int(head[net]) : int(head[net + 1])]

    @cached_property
    def _capacitors_by_net(self) -> tuple[IntArray, IntArray]:
        """Capacitor cards by net, then by number, and where those of each net begin."""
        a, b = self.devices.capacitor_nets
        between = np.flatnonzero(a != b)
        card, net = np.tile(between, 2), np.concatenate([a[between], b[between]])
        order = np.lexsort((card, net))
        nets = np.arange(len(self.devices.net_names) + 1)
        return card[order].astype(np.int32), np.searchsorted(net[order], nets)

    def capacitors_on(self, net: int) -> IntArray:
        """Return the capacitor cards between a net and another, by number."""
        order, head = self._capacitors_by_net
        return order[int(head[net]) : int(head[net + 1])]

    @cached_property
    def loose_devices(self) -> tuple[IntArray, IntArray]:
        """Devices in no gate, and those of them that lie outside all logic."""
        apart = _joined([some.devices for some in self.apart])
        return np.flatnonzero(self.gate_of_device < 0).astype(np.int32), apart

    @cached_property
    def arcs(self) -> Arcs:
        """Arcs of all gates."""
        values, inner = self.electrical, self.wire_cap + self.apart_cap
        width = self.devices.width * self.devices.multiplier
        return arcs_with_stages(self.alike, self.stages, values, inner, self.drive, width)

    @cached_property
    def net_cap(self) -> FloatArray:
        """Load outside the driving gate on each net, F, shape (nets,): pins, wires, outside."""
        pins = at_nets(self.pins.net, self.pins.cap.today, len(self.devices.net_names))
        return pins + self.fixed_cap

    @cached_property
    def gate_form(self) -> IntArray:
        """Index into ``alike`` of each gate."""
        return self._place[0]

    @cached_property
    def gate_row(self) -> IntArray:
        """Row of each gate in the arrays of its ``AlikeGates``."""
        return self._place[1]

    @cached_property
    def _place(self) -> tuple[IntArray, IntArray]:
        form, row = np.empty(len(self), np.int32), np.empty(len(self), np.int32)
        for index, some in enumerate(self.alike):
            form[some.gates] = index
            row[some.gates] = np.arange(len(some.gates))
        return form, row

    @cached_property
    def gate_of_device(self) -> IntArray:
        """Gate of each device, -1 for none, shape (devices,)."""
        found = np.full(len(self.devices), -1, np.int32)
        for some in self.alike:
            found[some.devices] = some.gates[:, None]
        return found

    def gate_devices(self, gate: int) -> IntArray:
        """Return the device ids of a gate, in drawing order."""
        devices: IntArray = self.alike[int(self.gate_form[gate])].devices[int(self.gate_row[gate])]
        return devices

    def gate_name(self, gate: int) -> str:
        """Return the path of a leaf's instance, or of the first transistor card of another gate."""
        if self.gate_is_leaf[gate]:
            return self.devices.instance_path(int(self.gate_instance[gate]))
        first = int(self.gate_devices(gate)[0])
        return self.devices.card_path(
            int(self.devices.card[first]), int(self.devices.instance[first])
        )

    def gate_kind(self, gate: int) -> str:
        """Return what kind of gate it is."""
        return self.alike[int(self.gate_form[gate])].form.kind

    def gate_subcircuit(self, gate: int) -> str:
        """Return the name of the subcircuit that holds a gate."""
        instance = int(self.gate_instance[gate])
        return self.devices.subcircuits[int(self.devices.instance_subcircuit[instance])]

    def gate_function(self, gate: int) -> str:
        """Return the Boolean function of a gate in net names local to its instance."""
        form = self.alike[self.gate_form[gate]].form

        def name(local: int) -> str:
            return self.local_name(gate, local)

        if form.function is not None:
            return text(form.function, name)
        return inverted_text(form.pull_down, name)

    def local_name(self, gate: int, local: int) -> str:
        """Return a local net of a gate by the name it has where the gate is drawn.

        Inside a leaf that is the port's name; elsewhere the net's name without the path of the
        instance that holds the gate.
        """
        net = int(self.alike[self.gate_form[gate]].nets[self.gate_row[gate], local])
        instance = int(self.gate_instance[gate])
        return self._names.local(instance, net)

    def net_name_inside(self, instance: int, net: int) -> str:
        """Return the name a net has in the subcircuit of an instance."""
        return self._names.local(instance, net)

    def net_id(self, name: str) -> int | None:
        """Return the id of a net by its full name, in any case."""
        return self._names.net_id(name)

    @cached_property
    def _names(self) -> Names:
        return Names(self.devices)

    @cached_property
    def total_width(self) -> float:
        """Sum of all transistor widths, copies counted, m."""
        return float(self.devices.width @ self.devices.multiplier)

    @cached_property
    def switched_cap(self) -> float:
        """Gate, diffusion, wire and outside capacitance of the block, F."""
        values = self.electrical
        parts = (values.gate.today, values.drain.today, values.source.today)
        wires = self.wire_cap[~self.supplies.is_supply].sum()
        return float(sum(part.sum() for part in parts) + wires + self.outside_cap.sum())

    def resized(self, factor: FloatArray) -> Circuit:
        """Return the circuit with every device's width multiplied by a factor, shape (devices,)."""
        old = self.devices
        extent = old.drain_area / old.width, old.source_area / old.width
        edges = [
            np.where(edge > 2 * e, 2 * e + (edge - 2 * e) * factor, edge)
            for edge, e in zip((old.drain_edge, old.source_edge), extent, strict=True)
        ]
        devices = replace(
            old,
            width=old.width * factor,
            drain_area=old.drain_area * factor,
            source_area=old.source_area * factor,
            drain_edge=edges[0],
            source_edge=edges[1],
        )
        return replace(self, devices=devices)

    def evaluate(self, inputs: Mapping[str, ArrayLike]) -> NetValues:
        """Return what every net is worth under input vectors; see `evaluate_circuit`."""
        return evaluate_circuit(self, inputs)

    def function(self, net: str) -> NetFunction:
        """Return a net in terms of the block's inputs; see `net_function`."""
        return net_function(self, net)

    def graph(self) -> nx.DiGraph[int]:
        """Return the graph of gates: an edge where one gate's output is another's input.

        Nodes are gate ids with attribute ``OUTPUT``; edges carry ``NET``.
        """
        graph: nx.DiGraph[int] = nx.DiGraph()
        graph.add_nodes_from(
            (gate, {OUTPUT: int(net)}) for gate, net in enumerate(self.gate_output)
        )
        driver = self.driver_of_net
        for gate, net in zip(self.pins.gate.tolist(), self.pins.net.tolist(), strict=True):
            if driver[net] >= 0:
                graph.add_edge(int(driver[net]), gate, **{NET: net})
        for some in self.stages:
            for part, node in dict.fromkeys((arc.part, arc.output) for arc in some.form.arcs):
                pairs = zip(some.gates[:, part].tolist(), some.nets[:, node].tolist(), strict=True)
                for gate, net in pairs:
                    heard = self.pins.gate[self.pins_on(net)].tolist()
                    graph.add_edges_from((gate, other, {NET: net}) for other in heard)
        return graph

    @cached_property
    def driver_of_net(self) -> IntArray:
        """Gate that drives each net, one of several, -1 for none, shape (nets,)."""
        driver = np.full(len(self.devices.net_names), -1, np.int32)
        alone = ~self.is_part
        for stage in self.stages:
            for node, part in stage.form.driven:
                driver[stage.nets[:, node]] = stage.gates[:, part]
        driver[self.gate_output[alone]] = np.flatnonzero(alone)
        return driver

    @cached_property
    def is_part(self) -> BoolArray:
        """Which gates are parts of a stage of several, or of one seen at inner nodes."""
        found = np.zeros(len(self), bool)
        for stage in self.stages:
            found[stage.gates] = True
        return found

    @cached_property
    def driven(self) -> IntArray:
        """Nets that arcs end at, by the gate that drives them, then by id."""
        nets = np.flatnonzero(self.driver_of_net >= 0)
        return nets[np.argsort(self.driver_of_net[nets], kind="stable")].astype(np.int32)


def _joined(parts: list[IntArray]) -> IntArray:
    return np.concatenate([np.zeros(0, np.int32), *parts])
