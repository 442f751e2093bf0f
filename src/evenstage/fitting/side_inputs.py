"""The state of a cell's other inputs that makes one of its arcs slowest."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.circuit.network import HIGH, LOW

if TYPE_CHECKING:
    from evenstage.circuit.gate import GateForm
    from evenstage.circuit.network import BoolArray
    from evenstage.fitting.bench import Bench
    from evenstage.netlist.devices import IntArray

#: Truth tables are kept for all states of a cell's inputs at once.
INPUTS_MAX: Final = 12

#: Weights of the estimate: extra resistance of each further device in series, what hangs on an
#: output in diffusions, and what an inner node adds.
_STACK: Final = 0.7
_LOAD: Final = 5.0
_INNER: Final = 0.3


@dataclass(frozen=True, slots=True)
class Setting:
    """How an arc is measured.

    Parameters
    ----------
    rising_input : bool
        Which way the input moves.
    others : tuple of (str, bool)
        The other inputs and their values.
    """

    rising_input: bool
    others: tuple[tuple[str, bool], ...]


@dataclass(frozen=True)
class _Gate:
    """A gate of a cell with the logic values at its pins for every state of the cell's inputs."""

    form: GateForm
    index: IntArray
    output: BoolArray


class CellLogic:
    """What the gates of one cell on a bench compute."""

    def __init__(self, bench: Bench, number: int) -> None:
        cell, circuit = bench.cells[number], bench.circuit
        nets = {port: bench.net(number, place) for place, port in enumerate(cell.signals)}
        self.outputs = tuple(p for p, net in nets.items() if circuit.driver_of_net[net] >= 0)
        has_pin = set(circuit.pins.net.tolist())
        self.inputs = tuple(
            port for port, net in nets.items() if port not in self.outputs and net in has_pin
        )
        count = len(self.inputs)
        self._nets = nets
        self._gates: list[_Gate] = []
        self._values: dict[int, BoolArray] = {}
        if count <= INPUTS_MAX:
            states = np.arange(1 << count)
            self._values = {
                nets[port]: (states >> row & 1).astype(bool) for row, port in enumerate(self.inputs)
            }
            self._evaluate(bench)

    def _evaluate(self, bench: Bench) -> None:
        """Work out every net that the inputs decide, gate by gate."""
        waiting = [
            (some.form, some.nets[row].tolist())
            for some in bench.circuit.alike
            for row in range(len(some.gates))
        ]
        growing = True
        while growing:
            ready = [
                one for one in waiting if all(one[1][i] in self._values for i in _inputs(one[0]))
            ]
            waiting = [one for one in waiting if one not in ready]
            growing = bool(ready)
            for form, nets in ready:
                index = sum(
                    (self._values[nets[local]].astype(np.int64) << row)
                    for row, local in enumerate(form.network.inputs)
                )
                assert not isinstance(index, int)
                output = ~form.network.conducts(form.output, LOW)[index]
                self._values[nets[form.output]] = output
                self._gates.append(_Gate(form, index, output))

    def knows(self, output: str) -> bool:
        """Tell whether an output follows from the inputs."""
        return self._nets[output] in self._values

    def slowest(self, pin: str, output: str, *, rising: bool) -> Setting | None:
        """Return the setting that makes an arc slowest, or None where the input cannot cause it.

        Settings are compared by the devices in series, the ways in parallel and the inner nodes of
        every gate that switches; sizes do not count.
        """
        bit = 1 << self.inputs.index(pin)
        value = self._values[self._nets[output]]
        states = np.arange(len(value))
        ends = states[value == rising]
        ends = ends[value[ends ^ bit] != rising]
        if not len(ends):
            return None
        cost = [self._cost(int(state ^ bit), int(state)) for state in ends]
        best = int(ends[int(np.argmax(cost))])
        others = tuple(
            (port, bool(best >> row & 1)) for row, port in enumerate(self.inputs) if port != pin
        )
        return Setting(bool(best & bit), others)

    def _cost(self, before: int, after: int) -> float:
        return sum(
            _gate_cost(gate, before, after)
            for gate in self._gates
            if gate.output[before] != gate.output[after]
        )


def _inputs(form: GateForm) -> tuple[int, ...]:
    return form.network.inputs


def _gate_cost(gate: _Gate, before: int, after: int) -> float:
    """Return about how long a gate takes, in units of a small one."""
    network, output = gate.form.network, gate.form.output
    supply = HIGH if gate.output[after] else LOW
    closed, was_closed = (
        frozenset(np.flatnonzero(network.closed[:, gate.index[state]]).tolist())
        for state in (after, before)
    )
    ways = list(network.paths(output, supply, closed))
    length = min(map(len, ways), default=1)
    settled = _tied(gate, supply, was_closed)
    moved = len(_tied(gate, output, closed) - settled) - 1
    return (1 + _STACK * (length - 1)) * (_LOAD / max(len(ways), 1) + _INNER * max(moved, 0))


def _tied(gate: _Gate, start: int, closed: frozenset[int]) -> set[int]:
    """Return the nodes that closed switches tie to a node, supplies as barriers."""
    network, found, waiting = gate.form.network, {start}, [start]
    while waiting:
        node = waiting.pop()
        for index in network.at_node.get(node, ()):
            far = network.switches[index].other(node)
            if index in closed and far >= 0 and far not in found:
                found.add(far)
                waiting.append(far)
    return found
