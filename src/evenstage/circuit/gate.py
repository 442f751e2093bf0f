"""What a network is as a static gate: its output, its function and its arcs.

An arc says how one edge of one input moves the output: along one path of closed switches from the
output to a supply, with the other inputs at values that let this input decide. It carries the nodes
whose charge must move with the output: those that closed switches tie to the output after the edge
and that were not yet at the new supply before it, each with the part of the path its charge has to
flow through. Paths through switches of the same inputs, as of stacks drawn twice in opposite order,
always conduct together and share the current; paths that only happen to conduct together do not.
Of several such settings every one is kept that is not outdone, switch by switch and node by node,
by another; which of them is slowest depends on the sizes.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property, lru_cache
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.function import Expression, conduction
from evenstage.circuit.network import HIGH, LOW, Network, Switch, merge
from evenstage.circuit.truth import ones, packed

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray

INPUTS_MAX = 12
"""Truth tables are kept for all input vectors at once; wider static gates are not drawn."""
SWITCHES_MAX = 200
"""Larger groups (bit lines, pass-transistor arrays) are no static gates."""

Relation = tuple[int, int]
"""Local net of an input and of the input that it is the complement of."""


Moved = tuple[tuple[int, int], ...]
"""Nodes, each with the number of switches, counted from the supply, its charge flows through."""


@dataclass(frozen=True, slots=True)
class Beside:
    """A path that conducts whenever the path of its arc does and meets it at its ends alone.

    Parameters
    ----------
    path : tuple of int
        Switches from the output to the supply.
    moved : tuple of (int, int)
        Nodes whose charge flows through it.
    """

    path: tuple[int, ...]
    moved: Moved


@dataclass(frozen=True, slots=True)
class ArcForm:
    """One way one input edge moves the output.

    Parameters
    ----------
    input : int
        Local net.
    rising : bool
        Whether the *output* rises.
    path : tuple of int
        Switches from the output to the supply.
    moved : tuple of (int, int)
        Node and the number of path switches, counted from the supply, its charge flows through.
    behind : tuple of (int, int)
        Those of them that a switch of the idle pull ties to the output, and that switch: it passes
        towards the wrong supply, n upwards or p downwards.
    load : tuple of int
        Switches of a path to the other supply that conducts all the while and is overpowered.
    beside : tuple of Beside
        Further paths that share the current.
    """

    input: int
    rising: bool
    path: tuple[int, ...]
    moved: Moved
    behind: tuple[tuple[int, int], ...] = ()
    load: tuple[int, ...] = ()
    beside: tuple[Beside, ...] = ()

    @property
    def ways(self) -> tuple[Beside, ...]:
        """Its path and those beside it, each with what moves through it."""
        return Beside(self.path, self.moved), *self.beside


@dataclass(frozen=True, slots=True)
class Weak:
    """Devices that hold the output until they are overpowered: a keeper or a load.

    Parameters
    ----------
    supply : int
        Where they hold the output.
    devices : tuple of tuple of int
        Drawn devices from the output to the supply: in series, at each place those in parallel.
    is_keeper : bool
        Whether a gate that listens to the output turns them on and off.
    node : int
        What they hold.
    """

    supply: int
    devices: tuple[tuple[int, ...], ...]
    is_keeper: bool
    node: int


@dataclass(frozen=True)
class GateForm:
    """A network recognised as one gate.

    Parameters
    ----------
    drawn : tuple of Switch
        The devices as drawn.
    network : Network
        The devices merged.
    output : int
        Its output node (and local net).
    pull_down : Expression
        When the output is 0.
    arcs : tuple of ArcForm
    kind : str
        What it is called.
    weak : tuple of Weak
        Its keepers and loads.
    floats : bool
        Whether its output is left alone for some inputs, and what keeps it then stores it.
    function : Expression, optional
        What it makes of its inputs, where that is not the complement of ``pull_down``.
    precharge : tuple of ArcForm
        Of a dynamic gate: how its output gets back to where it evaluates from.
    """

    drawn: tuple[Switch, ...]
    network: Network
    output: int
    pull_down: Expression
    arcs: tuple[ArcForm, ...]
    kind: str = "static gate"
    weak: tuple[Weak, ...] = ()
    floats: bool = False
    function: Expression | None = None
    precharge: tuple[ArcForm, ...] = ()

    @cached_property
    def precharging_clocks(self) -> tuple[int, ...]:
        """Local nets that turn the precharge of a dynamic gate on."""
        along = {switch for arc in self.precharge for switch in arc.path}
        return tuple(sorted({self.network.switches[switch].gate for switch in along}))


@dataclass(frozen=True)
class Unrecognised:
    """Why a network is not a static complementary gate."""

    reason: str


@dataclass(frozen=True)
class Pulls:
    """Truth tables of both pulls over all vectors, and the vectors that can occur."""

    up: BoolArray
    down: BoolArray
    possible: BoolArray

    @cached_property
    def bits(self) -> tuple[int, int]:
        """Pull-up and pull-down, as `evenstage.circuit.truth` writes them."""
        return packed(self.up), packed(self.down)


@lru_cache(maxsize=4096)
def recognise_network(
    devices: tuple[Switch, ...], relations: tuple[Relation, ...] = ()
) -> GateForm | Unrecognised:
    """Recognise one network as a static complementary gate, or say why it is none.

    Parameters
    ----------
    devices : tuple of Switch
        The drawn network; see `evenstage.circuit.network.merge`.
    relations : tuple of Relation
        Inputs known to be complements of other inputs.
    """
    network = merge(devices)
    if len(network.switches) > SWITCHES_MAX or len(network.inputs) > INPUTS_MAX:
        return Unrecognised(
            f"{len(network.switches)} switches with {len(network.inputs)} inputs are too many for "
            f"one static gate (at most {SWITCHES_MAX} and {INPUTS_MAX})"
        )
    if not network.driven_nodes:
        return Unrecognised("no node is pulled both up and down")
    if len(network.driven_nodes) > 1:
        return Unrecognised(
            f"{len(network.driven_nodes)} nodes are pulled both ways: pass transistors or a shared "
            "network"
        )
    (output,) = network.driven_nodes
    if output in network.inputs:
        return Unrecognised("its output is one of its own inputs")
    pulls = _pulls(network, output, relations)
    if isinstance(pulls, Unrecognised):
        return pulls
    arcs = all_arcs(network, output, pulls, relations)
    if not arcs:
        return Unrecognised("no input moves its output")
    return GateForm(devices, network, output, conduction(network, output, LOW, "n"), arcs)


def all_arcs(
    network: Network,
    output: int,
    pulls: Pulls,
    relations: tuple[Relation, ...],
    weak: frozenset[int] = frozenset(),
) -> tuple[ArcForm, ...]:
    """Return the arcs of all inputs of a network towards both edges of its output.

    Weak switches give way to others: the pulls must say so, and what they hold against an arc is
    its load.
    """
    return tuple(
        replace(arc, load=_load(network, output, arc, weak)) if weak else arc
        for row in range(len(network.inputs))
        for rising in (True, False)
        for arc in _arcs(network, output, pulls, row, relations, rising=rising)
    )


def _load(network: Network, output: int, arc: ArcForm, weak: frozenset[int]) -> tuple[int, ...]:
    """Return the shortest weak path towards the other supply that always conducts."""
    against = LOW if arc.rising else HIGH
    if against not in network.at_node:
        return ()
    return min(network.paths(output, against, weak), key=len, default=())


def _pulls(network: Network, output: int, relations: tuple[Relation, ...]) -> Pulls | Unrecognised:
    up, down = network.conducts(output, HIGH, "p"), network.conducts(output, LOW, "n")
    possible = possible_vectors(network, relations)
    anyhow_up, anyhow_down = network.conducts(output, HIGH), network.conducts(output, LOW)
    if ((anyhow_up != up) | (anyhow_down != down))[possible].any():
        return Unrecognised("an n switch pulls up or a p switch pulls down")
    if not network.inputs:
        return Unrecognised("no input moves its output")
    if (up & down)[possible].any():
        return Unrecognised("pull-up and pull-down conduct together: not complementary")
    if not (up | down)[possible].all():
        return Unrecognised("neither pull conducts for some inputs: it can float")
    return Pulls(up, down, possible)


def possible_vectors(network: Network, relations: tuple[Relation, ...]) -> BoolArray:
    """Tell which vectors can occur when some inputs are complements of others."""
    possible = np.ones(network.vectors.shape[1], bool)
    rows = {net: row for row, net in enumerate(network.inputs)}
    for net, complement in relations:
        if net in rows and complement in rows:
            possible &= network.vectors[rows[net]] != network.vectors[rows[complement]]
    return possible


def _arcs(
    network: Network,
    output: int,
    pulls: Pulls,
    row: int,
    relations: tuple[Relation, ...],
    *,
    rising: bool,
) -> list[ArcForm]:
    """Return the arcs of one input towards one output edge that no other outdoes."""
    supply = HIGH if rising else LOW
    others = tuple(r for r in relations if network.inputs[row] not in r)
    single: dict[ArcForm, None] = {}
    shared: dict[ArcForm, None] = {}
    for new in ones(_decisive(network, pulls, row, others, rising=rising)):
        closed = network.closed_under(new)
        was_closed = network.closed_under(new ^ (1 << row))
        ways = list(network.paths(output, supply, closed))
        path = min(ways, key=len)
        # What fights a load is at neither supply: it moves as soon as it lets go.
        other = LOW if rising else HIGH
        settled = _tied(network, supply, was_closed) - _tied(network, other, was_closed)
        alike = together = ways
        if len(ways) > 1:
            condition = network.condition(path)
            alike = [way for way in ways if network.condition(way) == condition]
            together = network.apart([path, *(way for way in alike if way != path)])
        moved, behind = _moved(network, together, closed, settled)
        beside = tuple(map(Beside, together[1:], moved[1:]))
        form = ArcForm(network.inputs[row], rising, path, moved[0], behind, beside=beside)
        (single if len(alike) == len(ways) else shared)[form] = None
    return _not_outdone(list(single) or list(shared))


def _decisive(
    network: Network, pulls: Pulls, row: int, relations: tuple[Relation, ...], *, rising: bool
) -> int:
    """Return the vectors that an edge of one input leads to and that begin to pull, as bits."""
    pull, against = pulls.bits if rising else pulls.bits[::-1]
    step = 1 << row
    is_set = packed(network.vectors[row])
    # Whether the other level of the input pulled already, moved to where it leads to.
    before, after = (pull >> step, ~is_set) if rising else (pull << step, is_set)
    possible = packed(possible_vectors(network, relations)) if relations else -1
    return ~before & pull & ~against & after & possible


def _tied(network: Network, start: int, closed: frozenset[int]) -> set[int]:
    """Return the nodes that closed switches tie to a node, supplies as barriers."""
    tied, waiting = {start}, [start]
    while waiting:
        node = waiting.pop()
        for index, far in network.near.get(node, ()):
            if index in closed and far not in tied and far >= 0:
                tied.add(far)
                waiting.append(far)
    return tied


def _moved(
    network: Network, paths: list[tuple[int, ...]], closed: frozenset[int], settled: set[int]
) -> tuple[list[Moved], Moved]:
    """Return the nodes whose charge moves, path by path, and those behind idle switches.

    A node beside the paths is charged through the path node nearest to the output that it is tied
    to, which is the slowest reading where a mesh offers several. Nodes behind a switch of the other
    polarity than the path's are named once more with the first such switch.
    """
    polarity = network.switches[paths[0][-1]].polarity
    found: dict[int, tuple[int, int]] = {}
    for number, path in enumerate(paths):
        for node, depth in network.nodes_along(path):
            found.setdefault(node, (number, depth))
    behind: dict[int, int] = {}
    for root, place in list(found.items()):
        waiting = [root]
        while waiting:
            here = waiting.pop()
            for index, far in network.near[here]:
                if index in closed and far >= 0 and far not in found:
                    found[far] = place
                    if here in behind or network.switches[index].polarity != polarity:
                        behind[far] = behind.get(here, index)
                    waiting.append(far)
    for node in settled & found.keys():
        found.pop(node)
        behind.pop(node, None)
    moved = [
        tuple(sorted((node, depth) for node, (by, depth) in found.items() if by == number))
        for number in range(len(paths))
    ]
    return moved, tuple(sorted(behind.items()))


def _not_outdone(forms: list[ArcForm]) -> list[ArcForm]:
    if len(forms) == 1:
        return forms
    kept = []
    for index, form in enumerate(forms):
        mine, behind = _depths(form), dict(form.behind)
        outdone = any(
            [way.path for way in other.ways] == [way.path for way in form.ways]
            and dict(other.behind).keys() & {node for _, node in mine} <= behind.keys()
            and all(_depths(other).get(place, 0) >= depth for place, depth in mine.items())
            and (_depths(other) != mine or position < index)
            for position, other in enumerate(forms)
            if position != index
        )
        if not outdone:
            kept.append(form)
    return kept


def _depths(form: ArcForm) -> dict[tuple[int, int], int]:
    """Return how many switches the charge of each node flows through, by its path and itself."""
    return {
        (number, node): depth for number, way in enumerate(form.ways) for node, depth in way.moved
    }
