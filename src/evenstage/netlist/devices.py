"""The elaborated block: every transistor and capacitor of it, in columns.

Integer ids stand for nets, cards and instances; their names are put together when somebody asks.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.errors import Notice
    from evenstage.netlist.netlist import Netlist
    from evenstage.process.process import Polarity

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.signedinteger]


@dataclass(frozen=True, slots=True)
class Model:
    """A transistor model as the cards name it.

    Parameters
    ----------
    name : str
        Model or wrapper subcircuit name, as written.
    polarity : {"n", "p"}
        Channel type.
    type_index : int
        Index of the type in ``Process.transistors``.
    """

    name: str
    polarity: Polarity
    type_index: int


@dataclass(frozen=True, kw_only=True)
class Wires:
    """Resistance along nets, and where on them everything hangs.

    A net that resistors run along falls into nodes. Shapes: ``(nodes,)``, ``(r,)`` per resistor,
    else as in `Devices`; node -1 stands for a net without resistance.

    Parameters
    ----------
    net : IntArray, shape (nodes,)
        Net each node belongs to.
    ends : IntArray, shape (2, r)
        Nodes each resistor joins.
    resistance : FloatArray, ohm, shape (r,)
        Above zero.
    head : IntArray, shape (m,)
        The node that carries each net's name: a port, where the net has one.
    drain, gate, source : IntArray, shape (n,)
        Nodes of each transistor.
    capacitor : IntArray, shape (2, k)
        Nodes of each C card.
    """

    net: IntArray
    ends: IntArray
    resistance: FloatArray
    head: IntArray
    drain: IntArray
    gate: IntArray
    source: IntArray
    capacitor: IntArray


@dataclass(frozen=True, kw_only=True)
class Devices:
    """Transistors, capacitors, instances and nets of one elaborated block.

    Shapes: ``(n,)`` per transistor, ``(k,)`` per capacitor, ``(i,)`` per instance, ``(m,)`` per
    net. Instance 0 is the block itself. All arrays are read-only.

    Parameters
    ----------
    netlist : Netlist
        Where everything comes from; ``netlist.card(number)`` is the card of a number.
    top : str
        Name of the elaborated subcircuit, or empty for the top level of the text.
    drain, gate, source, bulk : IntArray, shape (n,)
        Net ids.
    width : FloatArray, m, shape (n,)
        Drawn width of one copy of the card, all its fingers together.
    length : FloatArray, m, shape (n,)
        Drawn length.
    multiplier : FloatArray, shape (n,)
        Copies in parallel: the card's own multiplier times those of all enclosing instances.
    fingers : FloatArray, shape (n,)
        Fingers of one copy.
    drain_area, source_area, drain_edge, source_edge : FloatArray, m^2 or m, shape (n,)
        AD, AS, PD, PS; NaN where the card does not say.
    model : IntArray, shape (n,)
        Index into ``models``.
    card : IntArray, shape (n,)
        Number of the M card, or of the X card that calls a wrapped transistor.
    instance : IntArray, shape (n,)
        Instance whose subcircuit holds that card.
    models : tuple of Model
        The models met.
    capacitor_nets : IntArray, shape (2, k)
        Net ids of both ends of each C card.
    capacitance : FloatArray, F, shape (k,)
        Multiplied value of each C card.
    capacitor_card, capacitor_instance : IntArray, shape (k,)
        As for transistors.
    instance_parent, instance_card, instance_subcircuit : IntArray, shape (i,)
        Enclosing instance (-1 for the block), number of the calling X card (-1), index into
        ``subcircuits``.
    subcircuits : tuple of str
        Names of the definitions that occur (as written), the block's first.
    net_names : Sequence of str
        Full name of every net, instance path and dots before local names; put together on demand.
    ports : tuple of int
        Net ids of the block's ports in their order; empty for the top level.
    global_nets : frozenset of int
        Nets declared global.
    source_nets : tuple of (int, int, float)
        Plus net, minus net and DC value (V) of every V card at the block's level.
    notices : tuple of Notice
        What was assumed while elaborating.
    wires : Wires, optional
        None where no net has resistance.
    joined_names : Sequence of str
        Full names of nets as written that resistors make one with others.
    joined_net : IntArray
        The net each of them is now.
    """

    netlist: Netlist = field(repr=False)
    top: str
    drain: IntArray
    gate: IntArray
    source: IntArray
    bulk: IntArray
    width: FloatArray
    length: FloatArray
    multiplier: FloatArray
    fingers: FloatArray
    drain_area: FloatArray
    source_area: FloatArray
    drain_edge: FloatArray
    source_edge: FloatArray
    model: IntArray
    card: IntArray
    instance: IntArray
    models: tuple[Model, ...]
    capacitor_nets: IntArray
    capacitance: FloatArray
    capacitor_card: IntArray
    capacitor_instance: IntArray
    instance_parent: IntArray
    instance_card: IntArray
    instance_subcircuit: IntArray
    subcircuits: tuple[str, ...]
    net_names: Sequence[str] = field(repr=False)
    ports: tuple[int, ...]
    global_nets: frozenset[int]
    source_nets: tuple[tuple[int, int, float], ...]
    notices: tuple[Notice, ...]
    wires: Wires | None = None
    joined_names: Sequence[str] = field(default=(), repr=False)
    joined_net: IntArray = field(default_factory=lambda: np.zeros(0, np.int32), repr=False)

    def __len__(self) -> int:
        return len(self.card)

    def instance_path(self, instance: int) -> str:
        """Return the path of an instance, as in ``xbank.xrow3``; empty for the block itself."""
        names = []
        while instance > 0:
            names.append(self.netlist.card_name(int(self.instance_card[instance])))
            instance = int(self.instance_parent[instance])
        return ".".join(reversed(names))

    def card_path(self, card: int, instance: int) -> str:
        """Return the name of a card with its instance path, as in ``xbank.xrow3.mn1``."""
        name = self.netlist.card_name(card)
        path = self.instance_path(instance)
        return f"{path}.{name}" if path else name
