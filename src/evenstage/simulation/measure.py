"""Delays of single gates, measured by simulation: every arc over a grid of transitions and loads.

All gates, arcs and points stand side by side in one circuit whose parts do not touch: its matrices
fall into small blocks, and one integration measures them all.
"""

from __future__ import annotations

from contextlib import suppress
from dataclasses import dataclass, fields
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import Notice, SimulationError
from evenstage.progress import tell
from evenstage.simulation.beside import side_by_side, with_load
from evenstage.simulation.crossings import last_crossing, transition
from evenstage.simulation.excerpt import Route, excerpt
from evenstage.simulation.groups import Groups
from evenstage.simulation.integrate import integrate
from evenstage.simulation.parameters import parameters
from evenstage.simulation.ramps import Ramps
from evenstage.simulation.strength import strength

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.simulation.excerpt import Excerpt
    from evenstage.simulation.integrate import Waveforms
    from evenstage.simulation.parameters import Parameters
    from evenstage.timing.results import Yardstick

#: Input transitions, in those of a chain whose inverters each drive four of themselves.
TRANSITIONS: Final = (0.4, 0.7, 1.0, 1.5, 2.2)

#: Loads, in the capacitance of the measured input.
LOADS: Final = (0.5, 1.0, 2.0, 4.0, 8.0)

#: In FO4: how long a circuit settles, and how long it has to switch.
_SETTLING: Final = 20.0
_PATIENCE: Final = 2000.0

_ARRIVED: Final = 0.04

#: Points that are integrated together; more only make each step dearer.
_TOGETHER: Final = 1500


@dataclass(frozen=True, kw_only=True)
class GateDelays:
    """Measured arcs of gates in columns, shape ``(rows,)`` each.

    Parameters
    ----------
    gate, input, output : IntArray
        Gate ids; net ids.
    rising : BoolArray
        Whether the output rises.
    transition, load : FloatArray, s and F
        Of the input's ramp over the full swing; at the output, besides the gate's own.
    delay, output_transition : FloatArray, s
        50 to 50 %; 10 to 90 % over 0.8.
    input_cap : FloatArray, F
        Charge that the input takes up to half its swing, per half the supply.
    lost : int
        Points left out: the output did not swing from rail to rail.
    """

    gate: IntArray
    input: IntArray
    output: IntArray
    rising: BoolArray
    transition: FloatArray
    load: FloatArray
    delay: FloatArray
    output_transition: FloatArray
    input_cap: FloatArray
    lost: int

    @property
    def notices(self) -> tuple[Notice, ...]:
        """What could not be measured."""
        if not self.lost:
            return ()
        message = f"{self.lost} points were left out: the output did not swing from rail to rail"
        return (Notice("not-measured", message),)


def measure_gates(
    circuit: Circuit,
    unit: Yardstick,
    gates: Sequence[int],
    *,
    transitions: Sequence[float] = TRANSITIONS,
    loads: Sequence[float] = LOADS,
) -> GateDelays:
    """Measure every arc of some gates, the other inputs at the values that make it slowest.

    Parameters
    ----------
    circuit : Circuit
    unit : Yardstick
        Of its process: what transitions are counted in.
    gates : sequence of int
    transitions : sequence of float
        In the mean transition of the yardstick.
    loads : sequence of float
        In the capacitance of the measured input.

    Raises
    ------
    SimulationError
        ``simulation-stopped``, or ``no-arc`` where nothing can be measured.
    """
    some = parameters(circuit, strength(circuit.process, unit))
    groups = Groups(circuit)
    arcs = [arc for gate in gates for arc in _arcs(groups, some, int(circuit.gate_output[gate]))]
    if not arcs:
        raise SimulationError("no input of the gates to measure moves an output", code="no-arc")
    # A process without shapes knows no transitions.
    mean = (unit.transition_rise + unit.transition_fall) / 2 or unit.fo4
    points = len(transitions) * len(loads)
    rows = [arc for arc in arcs for _ in range(points)]
    ramp = np.tile(np.repeat(np.array(transitions) * mean, len(loads)), len(arcs))
    load = np.tile(np.array(loads), len(arcs) * len(transitions))
    load *= np.repeat([_pin_cap(circuit, arc) for arc in arcs], points)
    found = []
    for begin in range(0, len(rows), _TOGETHER):
        tell("measuring", begin / len(rows))
        some_rows = slice(begin, begin + _TOGETHER)
        chosen = rows[some_rows], ramp[some_rows], load[some_rows]
        waves, node = _run(circuit, unit, *chosen)
        found.append(_read_off(circuit, chosen[0], waves, (node, *chosen[1:])))
    return _joined(found)


def _joined(parts: Sequence[GateDelays]) -> GateDelays:
    """Put the rows of several runs under each other."""
    columns = {
        column.name: np.concatenate([getattr(part, column.name) for part in parts])
        for column in fields(GateDelays)
        if column.name != "lost"
    }
    return GateDelays(**columns, lost=sum(part.lost for part in parts))


def _arcs(groups: Groups, some: Parameters, output: int) -> list[Excerpt]:
    """Return each edge of each input that moves an output, as a path of one stage."""
    group = int(groups.of_net[output])
    found = []
    for net in groups.inputs(group):
        for rising in (False, True):
            for inverts in (True, False):
                edges = {net: (not rising, rising)}
                edges[output] = (rising, not rising) if inverts else (not rising, rising)
                route = Route(nets=(net, output), edges=edges, groups=(group,))
                with suppress(SimulationError):
                    found.append(
                        excerpt(groups, some, route, transition=1.0, drive=0.0, with_gates=False)
                    )
    return found


def _pin_cap(circuit: Circuit, arc: Excerpt) -> float:
    """Return the gate capacitance on an arc's input, F: what loads are counted in."""
    devices = arc.layout.devices
    here = circuit.devices.gate[devices] == arc.route.nets[0]
    return float(circuit.electrical.gate.today[devices[here]].sum())


def _input_cap(arc: Excerpt, first: int, waves: Waveforms, ramp: float) -> float:
    """Return the charge an input takes up to half its swing, per half the supply, F.

    That is what decides when a driver gets there. What is at the other end of a capacitor counts as
    far as it has moved by then: an output that moves against the input adds to it.
    """
    equations, entry = arc.layout.equations, arc.watched[0]
    inner = waves.at(np.array([0.0, ramp / 2]))[first : first + equations.unknown]
    share = np.array([0.0, 0.5])
    outer = arc.ramps.before[:, None] + (arc.ramps.after - arc.ramps.before)[:, None] * share
    moved = np.diff(np.concatenate([inner, outer]), axis=1)[:, 0]
    a, b = equations.capacitor_ends
    here = (a == entry) != (b == entry)
    across = np.abs(moved[a] - moved[b])[here]
    return float(equations.capacitance[here] @ across / abs(moved[entry]))


def _run(
    circuit: Circuit,
    unit: Yardstick,
    rows: Sequence[Excerpt],
    ramp: FloatArray,
    load: FloatArray,
) -> tuple[Waveforms, IntArray]:
    """Integrate all rows at once; return the waveforms and the output's node of each row."""
    supply = circuit.process.supply
    parts = [
        with_load(row.layout.equations, row.watched[1], cap)
        for row, cap in zip(rows, load.tolist(), strict=True)
    ]
    first = np.cumsum([0, *(part.unknown for part in parts)])[:-1]
    node = first + np.array([row.watched[1] for row in rows])
    goal = np.array([row.route.edges[row.route.nets[1]][1] for row in rows]) * supply

    def arrived(_time: float, voltage: FloatArray) -> bool:
        return bool((np.abs(voltage[node] - goal) < _ARRIVED * supply).all())

    given = [part.given for part in parts]
    waves = integrate(
        side_by_side(parts),
        Ramps(
            np.concatenate([row.ramps.before for row in rows]),
            np.concatenate([row.ramps.after for row in rows]),
            np.zeros(sum(given)),
            np.repeat(ramp, given),
        ),
        np.concatenate([row.initial for row in rows]),
        (-_SETTLING * unit.fo4, _PATIENCE * unit.fo4),
        unit=unit.tau,
        supply=supply,
        finished=arrived,
    )
    return waves, node


def _read_off(
    circuit: Circuit,
    rows: Sequence[Excerpt],
    waves: Waveforms,
    columns: tuple[IntArray, FloatArray, FloatArray],
) -> GateDelays:
    """Return the rows whose output switched; a notice counts the others."""
    node, ramp, load = columns
    supply = circuit.process.supply
    nets = np.array([row.route.nets for row in rows])
    rising = np.array([row.route.edges[row.route.nets[1]][1] for row in rows], bool)
    pairs = list(zip(node.tolist(), rising.tolist(), strict=True))
    crossing = [last_crossing(waves, n, supply / 2, rising=up) for n, up in pairs]
    leaving = [transition(waves, n, supply, rising=up) for n, up in pairs]
    delay = np.array([np.nan if at is None else at for at in crossing], float) - ramp / 2
    swing = np.array([np.nan if one is None else one for one in leaving], float)
    kept = np.flatnonzero(~np.isnan(delay) & ~np.isnan(swing))
    first = node - np.array([row.watched[1] for row in rows])
    input_cap = np.array([
        _input_cap(row, begin, waves, width)
        for row, begin, width in zip(rows, first.tolist(), ramp.tolist(), strict=True)
    ])  # fmt: skip
    return GateDelays(
        gate=circuit.driver_of_net[nets[kept, 1]],
        input=nets[kept, 0],
        output=nets[kept, 1],
        rising=rising[kept],
        transition=ramp[kept],
        load=(load + circuit.net_cap[nets[:, 1]])[kept],
        delay=delay[kept],
        output_transition=swing[kept],
        input_cap=input_cap[kept],
        lost=len(rows) - len(kept),
    )
