"""One path in logical-effort terms, stage by stage.

For an arc with path resistance R, charge q and input capacitance C_in, in units of tau:
``g = q R C_in / tau``, ``h = C_on / C_in``, ``b = C_total / C_on``, ``f = g h b`` and ``p = q own /
tau``, with C_on the next input on the path and C_total all that hangs outside the gate, so that the
charged delay is ``tau (f + p)`` exactly; the delay of a wire behind the gate counts in p. Where a
stage charges further nets through a part of R, as behind pass transistors, these count in C_total
by their part. Along a path ``F = G B H`` (Sutherland, Sproull and Harris, Logical Effort, 1999,
chapters 1 and 3, from memory).
"""

from __future__ import annotations

import math
import sys
from dataclasses import dataclass
from itertools import accumulate, islice
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from evenstage.timing.results import Path, SideBranch, Stage
from evenstage.timing.yardstick import best_stage_count, best_stage_effort

if TYPE_CHECKING:
    from collections.abc import Iterable

    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray
    from evenstage.timing.results import Edge
    from evenstage.timing.search import ArcPath
    from evenstage.timing.sweep import Timing


@dataclass(frozen=True, slots=True)
class _Load:
    """What hangs on a net outside its driver: the part on the path and the rest, F."""

    on_path: float
    total: float
    branches: tuple[SideBranch, ...]


def edge_name(*, rising: bool) -> Edge:
    """Return ``rise`` or ``fall``."""
    return "rise" if rising else "fall"


def describe(timing: Timing, arcs: ArcPath) -> Path:
    """Describe a path of graph arcs."""
    graph, unit = timing.graph, timing.unit
    first, last = int(graph.source[arcs[0]]), int(graph.target[arcs[-1]])
    begin = float(timing.start_arrival[np.flatnonzero(graph.start == first)[0]])
    wires = _wires(timing, arcs)
    # An arc's delay begins with the wire before it, which is the stage's that drives the wire.
    delays = timing.delay[list(arcs)] - timing.wire[list(arcs)] + wires.delay
    arrivals = accumulate(delays.tolist(), initial=begin)
    stages = tuple(
        _stage(timing, arc, following, arrival, wires.of(index))
        for index, (arc, following, arrival) in enumerate(
            zip(arcs, [*arcs[1:], None], islice(arrivals, 1, None), strict=True)
        )
    )
    log_effort = math.fsum(math.log(stage.stage_effort) for stage in stages)
    parasitic = sum(stage.parasitic_delay for stage in stages)
    count = len(stages)
    required = graph.end_required[graph.end == last]
    names = timing.circuit.devices.net_names
    return Path(
        start=names[graph.net[first]],
        start_edge=edge_name(rising=bool(graph.rising[first])),
        start_arrival=begin,
        end=names[graph.net[last]],
        edge=edge_name(rising=bool(graph.rising[last])),
        corner=unit.process,
        delay=stages[-1].arrival,
        charged_delay=begin + sum(stage.charged_delay for stage in stages),
        required=float(required[0]) if len(required) and not np.isnan(required[0]) else None,
        logical_effort=_product(stage.logical_effort for stage in stages),
        branching_effort=_product(stage.branching_effort for stage in stages),
        electrical_effort=_product(stage.electrical_effort for stage in stages),
        path_effort=_product(stage.stage_effort for stage in stages),
        parasitic_delay=parasitic,
        best_stage_effort=best_stage_effort(unit.p_inv),
        best_stage_count=best_stage_count(log_effort, count, parasitic, unit.p_inv),
        least_delay=unit.tau * (count * math.exp(log_effort / count) + parasitic),
        stages=stages,
    )


class _Wire(NamedTuple):
    """The wire behind a stage: delay and charged delay, s, and the transition at its end, s."""

    delay: float
    charged: float
    transition: float


class _Wires(NamedTuple):
    """The wires behind the stages of a path; shape (stages,)."""

    delay: FloatArray
    charged: FloatArray
    transition: FloatArray

    def of(self, stage: int) -> _Wire:
        """Return the wire behind one stage."""
        return _Wire(*(float(column[stage]) for column in self))


def _wires(timing: Timing, arcs: ArcPath) -> _Wires:
    """Return the wires behind the stages of a path; the first stage has the one before it too."""
    end = np.flatnonzero(timing.graph.end == timing.graph.target[arcs[-1]])[:1]
    inner = list(arcs[1:])
    columns = (
        (timing.wire, timing.end_wire),
        (timing.charged_wire, timing.end_charged_wire),
        (timing.sink_transition, timing.end_transition),
    )
    delay, charged, transition = (
        np.concatenate([along[inner], behind[end]]) for along, behind in columns
    )
    delay[0] += timing.wire[arcs[0]]
    charged[0] += timing.charged_wire[arcs[0]]
    return _Wires(delay, charged, transition)


def _product(factors: Iterable[float]) -> float:
    """Return a product, capped where very many stages drive it out of the range of floats."""
    logarithm = math.fsum(math.log(factor) for factor in factors)
    largest = sys.float_info.max
    return math.exp(logarithm) if logarithm < math.log(largest) else largest


def _stage(
    timing: Timing, graph_arc: int, following: int | None, arrival: float, wire: _Wire
) -> Stage:
    circuit, graph, unit = timing.circuit, timing.graph, timing.unit
    arcs, arc = circuit.arcs, int(graph.arc[graph_arc])
    gate, names = int(arcs.gate[arc]), circuit.devices.net_names
    follower = None if following is None else int(arcs.gate[graph.arc[following]])
    load = _load(circuit, arc, follower)
    rising = bool(arcs.rising[arc])
    charge = float(timing.charge[graph_arc])
    input_cap = _pin_cap(circuit, gate, int(arcs.input[arc]))
    resistance = float(arcs.output_resistance[arc])
    logical = charge * resistance * input_cap / unit.tau
    hidden = float(timing.elmore[graph_arc] - timing.effective[graph_arc]) / resistance
    net = int(arcs.output[arc])
    electrical, branching = load.on_path / input_cap, load.total / load.on_path
    own = float(arcs.own_today[arc])
    devices = circuit.gate_devices(gate)
    plain = float(timing.charged[graph_arc] - timing.charged_wire[graph_arc])
    has_wire = timing.wired is not None and timing.wired.drive[graph_arc] >= 0
    return Stage(
        instance=circuit.gate_name(gate),
        subcircuit=circuit.gate_subcircuit(gate),
        function=circuit.gate_function(gate),
        input=names[arcs.input[arc]],
        output=names[arcs.output[arc]],
        edge=edge_name(rising=rising),
        arrival=arrival,
        delay=float(timing.delay[graph_arc] - timing.wire[graph_arc]) + wire.delay,
        charged_delay=plain + wire.charged,
        transition=wire.transition,
        logical_effort=logical,
        electrical_effort=electrical,
        branching_effort=branching,
        stage_effort=logical * electrical * branching,
        parasitic_delay=(charge * own + wire.charged) / unit.tau,
        input_cap=input_cap,
        load_cap=load.total,
        on_path_cap=load.on_path,
        self_cap=_self_cap(circuit, gate),
        width=float(circuit.devices.width[devices] @ circuit.devices.multiplier[devices]),
        side_branches=load.branches,
        wire_delay=wire.delay,
        wire_cap=float(circuit.wire_cap[net]),
        effective_cap=load.total - hidden if has_wire else None,
        through=tuple(
            dict.fromkeys(
                circuit.gate_name(other)
                for other in arcs.gates_along(np.array([arc], np.int32)).tolist()
                if other != gate
            )
        ),
    )


def _pin_cap(circuit: Circuit, gate: int, net: int) -> float:
    """Return the capacitance of a gate's pin on a net, F."""
    pins = circuit.pins
    begin, end = np.searchsorted(pins.gate, [gate, gate + 1])
    which = begin + np.flatnonzero(pins.net[begin:end] == net)
    return float(pins.cap.today[which].sum())


def _self_cap(circuit: Circuit, gate: int) -> float:
    """Return the diffusion capacitance on a gate's output, F."""
    devices, net = circuit.gate_devices(gate), circuit.gate_output[gate]
    values, block = circuit.electrical, circuit.devices
    drain = values.drain.today[devices] * (block.drain[devices] == net)
    source = values.source.today[devices] * (block.source[devices] == net)
    return float((drain + source).sum())


def _load(circuit: Circuit, arc: int, follower: int | None) -> _Load:
    """Return what loads an arc: the follower's pin, or what ends the path, and the side branches.

    At a path end the load outside is on the path. Where nothing is outside, the wire is, then all.
    """
    net = int(circuit.arcs.output[arc])
    on_pins, fixed = _pin_loads(circuit, net), _fixed_loads(circuit, net)
    fixed += _loads_on_the_way(circuit, arc)
    total = sum(branch.cap for _, branch in on_pins) + sum(branch.cap for branch in fixed)
    if follower is not None:
        on_path = sum(branch.cap for gate, branch in on_pins if gate == follower)
        branches = [branch for gate, branch in on_pins if gate != follower] + fixed
    else:
        outside = [branch for branch in fixed if branch.pin == "load"] or fixed
        on_path = sum(branch.cap for branch in outside) or total
        branches = [branch for _, branch in on_pins if outside]
        branches += [branch for branch in fixed if branch not in outside]
    branches.sort(key=lambda branch: (-branch.cap, branch.instance, branch.pin))
    return _Load(on_path, total, tuple(branches))


def _loads_on_the_way(circuit: Circuit, arc: int) -> list[SideBranch]:
    """Return the other nets an arc charges, each by the part of the resistance it is behind."""
    arcs, charges = circuit.arcs, circuit.arcs.charges
    some = slice(int(charges.head[arc]), int(charges.head[arc + 1]))
    shares: dict[int, float] = {}
    for net, resistance in zip(
        charges.net[some].tolist(), charges.resistance[some].tolist(), strict=True
    ):
        if net != arcs.output[arc]:
            shares[net] = shares.get(net, 0.0) + resistance
    whole, names = float(arcs.output_resistance[arc]), circuit.devices.net_names
    return [
        SideBranch(instance=names[net], pin="on the way", cap=share / whole * float(cap))
        for net, share in shares.items()
        if (cap := circuit.net_cap[net]) > 0
    ]


def _pin_loads(circuit: Circuit, net: int) -> list[tuple[int, SideBranch]]:
    """Return the gate pins on a net, in the order of the gates."""
    pins = circuit.pins
    return [
        (
            gate := int(pins.gate[pin]),
            SideBranch(
                instance=circuit.gate_name(gate),
                pin=circuit.local_name(gate, int(pins.local[pin])),
                cap=float(pins.cap.today[pin]),
            ),
        )
        for pin in circuit.pins_on(net).tolist()
    ]


def _fixed_loads(circuit: Circuit, net: int) -> list[SideBranch]:
    """Return the capacitor cards, transistors outside gates, and outside load on a net."""
    devices, found = circuit.devices, []
    for index in circuit.capacitors_on(net).tolist():
        card, instance = devices.capacitor_card[index], devices.capacitor_instance[index]
        name = devices.card_path(int(card), int(instance))
        found.append(
            SideBranch(instance=name, pin="wire", cap=float(circuit.capacitor_value[index]))
        )
    found += _other_transistors(circuit, net)
    if circuit.outside_cap[net] > 0:
        found.append(SideBranch(instance="", pin="load", cap=float(circuit.outside_cap[net])))
    return found


def _other_transistors(circuit: Circuit, net: int) -> list[SideBranch]:
    """Return the transistors in no gate that load a net, by their gates or their channels."""
    devices, values = circuit.devices, circuit.electrical
    outside, apart = circuit.loose_devices
    found = []
    for pin, nets, capacitance, which in (
        ("gate", devices.gate, values.gate, outside),
        ("drain", devices.drain, values.drain, apart),
        ("source", devices.source, values.source, apart),
    ):
        for device in which[nets[which] == net].tolist():
            name = devices.card_path(int(devices.card[device]), int(devices.instance[device]))
            cap = float(capacitance.today[device])
            found.append(SideBranch(instance=name, pin=pin, cap=cap))
    return found
