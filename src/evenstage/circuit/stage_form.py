"""What a stage of drivers and passes is: parts, arcs through them, nodes seen outside."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from evenstage.circuit.gate import GateForm, Weak
    from evenstage.circuit.literals import Cube
    from evenstage.circuit.network import Network, Switch


@dataclass(frozen=True, slots=True)
class Facts:
    """What is known around a group; all nets are local.

    Parameters
    ----------
    ties : tuple of (int, int, bool)
        Two nets, and whether they are equal rather than complements.
    seen : tuple of int
        Channel ends that are ports or close switches, of this or of other groups.
    gating : tuple of int
        Channel ends that close switches.
    open : tuple of int
        Channel ends that the outside may drive.
    inputs, outputs : tuple of int
        Channel ends that the brief calls so.
    clocks : tuple of int
        Inputs that are clocks.
    pairs : tuple of (int, int)
        Outputs of sense amplifiers, whose own feedback makes no arcs.
    """

    ties: tuple[tuple[int, int, bool], ...] = ()
    seen: tuple[int, ...] = ()
    gating: tuple[int, ...] = ()
    open: tuple[int, ...] = ()
    inputs: tuple[int, ...] = ()
    outputs: tuple[int, ...] = ()
    clocks: tuple[int, ...] = ()
    pairs: tuple[tuple[int, int], ...] = ()


@dataclass(frozen=True, slots=True)
class Step:
    """Switches in parallel that a route runs through, and the part of the stage they belong to."""

    part: int
    switches: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class StageArc:
    """One way one input edge moves one output.

    Parameters
    ----------
    part : int
        Whose input moves.
    input, output : int
        Local net, node.
    input_rising, rising : bool
    steps : tuple of Step
        From the output to the supply.
    moved : tuple of (int, int)
        Node and the number of steps, counted from the supply, its charge flows through.
    behind : tuple of (int, int)
        Inner nodes of drivers among them that a switch of the idle pull ties to the output, and
        that switch.
    switching : int
        The switch that closes; -1 where the outside drives.
    source : int
        Node that the outside drives, -1 for none.
    factor : float
        What the resistances of its steps count, where more than an RC response happens.
    """

    part: int
    input: int
    output: int
    input_rising: bool
    rising: bool
    steps: tuple[Step, ...]
    moved: tuple[tuple[int, int], ...]
    behind: tuple[tuple[int, int], ...]
    switching: int
    source: int
    factor: float = 1.0


@dataclass(frozen=True, slots=True)
class Sink:
    """A node seen outside: when it is high, and when low; both as sums over its routes.

    ``part`` is one that drives it; ``weak_high`` and ``weak_low`` tell that a single pass
    transistor may leave that level short of the supply.
    """

    node: int
    part: int
    high: tuple[Cube, ...]
    low: tuple[Cube, ...]
    weak_high: bool
    weak_low: bool


@dataclass(frozen=True, eq=False)
class StageForm:
    """A network recognised as a stage of drivers and passes.

    Parameters
    ----------
    drawn : tuple of Switch
    network : Network
    columns : tuple of tuple of int
        For each part, its devices among the drawn.
    parts : tuple of GateForm
        Each part as a gate without arcs of its own.
    arcs : tuple of StageArc
    sinks : tuple of Sink
    sources : tuple of int
        Nodes that the outside drives.
    assumed : tuple of (int, int)
        Inputs taken for complements without proof.
    both_ways : tuple of int
        Parts that pass signals in both directions.
    bounded : tuple of int
        Nodes that arcs end at, where more is taken to move with them than can at once.
    lines : tuple of (int, int, int)
        Nodes where of many passes or pull networks one at a time is taken to conduct, one of the
        parts there, and how many.
    pairs : tuple of (int, int)
        Outputs of its sense amplifiers.
    weak : tuple of Weak
        Its keepers; whatever drives their nodes overpowers them.
    precharge : tuple of StageArc
        How its dynamic nodes get back to where they evaluate from.
    """

    drawn: tuple[Switch, ...]
    network: Network
    columns: tuple[tuple[int, ...], ...]
    parts: tuple[GateForm, ...]
    arcs: tuple[StageArc, ...]
    sinks: tuple[Sink, ...]
    sources: tuple[int, ...]
    assumed: tuple[tuple[int, int], ...]
    both_ways: tuple[int, ...]
    bounded: tuple[int, ...]
    lines: tuple[tuple[int, int, int], ...] = ()
    pairs: tuple[tuple[int, int], ...] = ()
    weak: tuple[Weak, ...] = ()
    precharge: tuple[StageArc, ...] = ()

    @cached_property
    def unseen(self) -> tuple[int, ...]:
        """Nodes that the stage drives and nothing outside it sees."""
        seen = {sink.node for sink in self.sinks}
        return tuple(node for node, _ in self.driven if node not in seen)

    @cached_property
    def driven(self) -> tuple[tuple[int, int], ...]:
        """Nodes that the stage drives, seen outside, dynamic or lines, and a part that does."""
        found = {node: part for node, part, _ in reversed(self.lines)}
        found |= {arc.output: arc.part for arc in self.precharge}
        return tuple((found | {sink.node: sink.part for sink in self.sinks}).items())
