"""Values of a circuit's nets: what users say by name, as the logic room wants it."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.circuit.capacitance import at_nets
from evenstage.errors import CircuitError, SettingsError
from evenstage.logic.cover import cover
from evenstage.logic.evaluate import evaluate, input_table
from evenstage.logic.order import fan_in, find_groups
from evenstage.logic.switches import UNKNOWN, switches_of
from evenstage.pattern import nearest_names

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping

    from numpy.typing import ArrayLike

    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.logic.cover import Cube
    from evenstage.logic.evaluate import Evaluation
    from evenstage.logic.switches import Switches, Values

INPUTS_MOST: Final = 16
"""Functions of more inputs are not written down."""


@dataclass(frozen=True)
class NetValues:
    """What the nets of a circuit are worth.

    Parameters
    ----------
    shape : tuple of int
        Of each net's values, that of the inputs: ``(vectors,)`` or ``(steps, vectors)``.
    evaluation : Evaluation
        All values in columns.
    """

    shape: tuple[int, ...]
    evaluation: Evaluation = field(repr=False)
    _circuit: Circuit = field(repr=False)

    def __getitem__(self, net: str) -> Values:
        """Return the values of a net by its name: 0, 1, or -1 for unknown."""
        found: Values = self.evaluation.values[_net(self._circuit, net)].reshape(self.shape)
        return found

    def strength(self, net: str) -> Values:
        """Return how a net is driven: 3 from outside, 2 strongly, 1 weakly, 0 not at all.

        Weakly: against something else, or to a level that an n or p channel degrades. What is not
        driven keeps its charge.
        """
        found: Values = self.evaluation.strength[_net(self._circuit, net)].reshape(self.shape)
        return found


@dataclass(frozen=True)
class NetFunction:
    """A net in terms of the inputs of its block.

    Parameters
    ----------
    net : str
    inputs : tuple of str
    table : Values, shape (2**inputs,)
        Bit ``k`` of a place is the value of input ``k`` there; 0, 1, or -1 where the inputs alone
        do not decide: the net stores, floats, or is fought over.
    """

    net: str
    inputs: tuple[str, ...]
    table: Values = field(repr=False)

    def __str__(self) -> str:
        return self._sum(self.table == 1)

    @property
    def undecided(self) -> str:
        """When the inputs alone do not decide; ``0`` where they always do."""
        return self._sum(self.table == UNKNOWN)

    def _sum(self, wanted: BoolArray) -> str:
        cubes = cover(wanted)
        if not cubes or cubes == ((),):
            return "1" if cubes else "0"
        return " | ".join(map(self._product, sorted(cubes)))

    def _product(self, cube: Cube) -> str:
        return " & ".join(f"{'' if level else '!'}{self.inputs[at]}" for at, level in cube)


def switches(circuit: Circuit) -> Switches:
    """Return all transistors of a circuit as switches."""
    devices, values, nets = circuit.devices, circuit.electrical, len(circuit.devices.net_names)
    hung = (
        (devices.gate, values.gate),
        (devices.drain, values.drain),
        (devices.source, values.source),
    )
    cap = circuit.wire_cap + circuit.outside_cap
    for net, part in hung:
        cap = cap + at_nets(net, part.today, nets)
    supplies = circuit.supplies
    return switches_of(devices, supplies.is_high, supplies.is_low, values.resistance.today, cap)


def evaluate_circuit(circuit: Circuit, inputs: Mapping[str, ArrayLike]) -> NetValues:
    """Return what every net is worth under input vectors, transistors taken as switches.

    See `evenstage.logic.settle` for the model. Inputs that are not named are unknown; any net but a
    supply may be named, and is held then.

    Parameters
    ----------
    circuit : Circuit
    inputs : mapping of str to array
        0, 1 or -1 (unknown) by net name, all of one shape: ``(vectors,)``, independent of each
        other, or ``(steps, vectors)``, storage and charge kept from step to step.

    Raises
    ------
    SettingsError
        Where a name or a value is none, or the shapes differ.
    """
    named = {_net(circuit, name): _levels(name, wanted) for name, wanted in inputs.items()}
    for net in named:
        if circuit.supplies.is_supply[net]:
            name = circuit.devices.net_names[net]
            raise SettingsError(f"'{name}' is a supply and has its value", code="supply-driven")
    try:
        alike = np.broadcast_arrays(*named.values())
    except ValueError:
        shapes = ", ".join(f"'{name}' {np.shape(wanted)}" for name, wanted in inputs.items())
        raise SettingsError(
            f"inputs need values of one shape, (vectors,) or (steps, vectors); got {shapes}",
            code="input-shapes",
        ) from None
    shape = alike[0].shape if alike else ()
    if len(shape) > 2:
        raise SettingsError(
            f"inputs have values of shape (vectors,) or (steps, vectors), got {shape}",
            code="input-shapes",
        )
    steps, vectors = (1, 1, *shape)[-2:]
    wanted = {net: one.reshape(steps, vectors) for net, one in zip(named, alike, strict=True)}
    return NetValues(shape, evaluate(switches(circuit), wanted), circuit)


def net_function(circuit: Circuit, name: str) -> NetFunction:
    """Return the Boolean function of a net in terms of the block's inputs.

    Raises
    ------
    CircuitError
        ``many-inputs`` where it depends on more than `INPUTS_MOST`.
    SettingsError
        Where there is no such net.
    """
    net = _net(circuit, name)
    every = switches(circuit)
    given = circuit.supplies.is_supply.copy()
    outside = outside_nets(circuit, every)
    outside[net] = False
    given |= outside
    groups = find_groups(every, given)
    own = groups.of_net[[net]]
    reached = fan_in(groups, own[own >= 0])
    part = every.some((groups.of_device >= 0) & reached[groups.of_device])
    touched = np.unique(np.concatenate([part.drain, part.gate, part.source]))
    leaves = touched[~circuit.supplies.is_supply[touched] & (groups.of_net[touched] < 0)]
    names = circuit.devices.net_names
    if len(leaves) > INPUTS_MOST:
        raise CircuitError(
            f"'{names[net]}' depends on {len(leaves)} inputs; functions of at most {INPUTS_MOST} "
            "are written down (evaluate the circuit for the vectors that matter)",
            code="many-inputs",
        )
    found = evaluate(part, dict(zip(leaves.tolist(), input_table(len(leaves)), strict=True)))
    table = found.values[net, 0]
    return NetFunction(names[net], tuple(names[leaf] for leaf in leaves.tolist()), table)


def outside_nets(circuit: Circuit, every: Switches) -> BoolArray:
    """Tell which nets are decided from outside, shape (nets,): ports no gate and no supply drives.

    A port that pass transistors alone join to other nets is one too.
    """
    nets = len(circuit.devices.net_names)
    pulled = np.zeros(nets, bool)
    for here, there in ((every.drain, every.source), (every.source, every.drain)):
        pulled[here[every.supply[there] != UNKNOWN]] = True
    is_port = np.zeros(nets, bool)
    is_port[list(circuit.devices.ports)] = True
    found: BoolArray = is_port & ~pulled & (circuit.driver_of_net < 0)
    return found & ~circuit.supplies.is_supply


def _net(circuit: Circuit, name: str) -> int:
    net = circuit.net_id(name)
    if net is None:
        raise SettingsError(_no_net(name, circuit.devices.net_names), code="unknown-net")
    return net


def _no_net(name: str, names: Iterable[str]) -> str:
    near = nearest_names(name, names)
    hint = f"; did you mean {' or '.join(repr(one) for one in near)}?" if near else ""
    return f"there is no net '{name}'{hint}"


def _levels(name: str, wanted: ArrayLike) -> Values:
    given = np.asarray(wanted)
    fits = given.dtype.kind in "biu" and bool(np.isin(given, (UNKNOWN, 0, 1)).all())
    if not fits:
        raise SettingsError(
            f"values of '{name}' must be 0, 1 or -1 (unknown), as integers or booleans",
            code="input-values",
        )
    return given.astype(np.int8)
