"""Which switches precharge the nodes of a group that is several gates.

A node is dynamic where one condition alone pulls it to a supply, and what pulls it the other way
is neither the complement of that condition nor a single transistor driven apart: networks of
further inputs, or pass transistors of the one polarity that discharges well. Manchester carry
chains and bit lines are such nodes.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.circuit.division import Charging, closing
from evenstage.circuit.network import HIGH, LOW

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.literals import Condition, Literals
    from evenstage.circuit.network import Network


class Chargers:
    """Finds what precharges the nodes of one network.

    Parameters
    ----------
    network : Network
    passing : sequence of int
        Switches between terminals.
    literals : Literals
    clocks : frozenset of int
        Inputs known to be clocks.
    """

    def __init__(
        self, network: Network, passing: Sequence[int], literals: Literals, clocks: frozenset[int]
    ) -> None:
        self._network, self._literals = network, literals
        self._clocks = {literals.condition(net, value=True)[0] for net in clocks}
        between: dict[tuple[int, int], list[int]] = {}
        for index in passing:
            switch = network.switches[index]
            between.setdefault((min(switch.a, switch.b), max(switch.a, switch.b)), []).append(index)
        self._single: dict[tuple[int, str], list[int]] = {}
        for ends, some in between.items():
            polarities = {network.switches[index].polarity for index in some}
            for polarity in polarities if len(polarities) == 1 else ():
                for end in ends:
                    self._single.setdefault((end, polarity), []).extend(some)

    def at(self, node: int, parts: Sequence[Sequence[int]]) -> Charging | None:
        """Return what precharges a node, given its pull networks; None for a static one."""
        for supply, polarity in ((HIGH, "p"), (LOW, "n")):
            up = [part for part in parts if self._leads(part, supply)]
            switches = self._network.switches
            if not up or any(
                len(part) > 1 or switches[part[0]].polarity != polarity for part in up
            ):
                continue
            gates = {switches[part[0]].gate for part in up}
            if len(gates) != 1 or min(gates) < 0 or gates & self._network.at_node.keys():
                continue
            found = closing(switches[up[0][0]], self._literals)
            rest = [part for part in parts if part not in up]
            if self._is_dynamic(node, found, rest, "n" if polarity == "p" else "p"):
                return Charging(node, supply, tuple(part[0] for part in up), found)
        return None

    def _leads(self, part: Sequence[int], supply: int) -> bool:
        return any(supply in (s.a, s.b) for s in (self._network.switches[i] for i in part))

    def _is_dynamic(
        self, node: int, found: Condition, rest: Sequence[Sequence[int]], polarity: str
    ) -> bool:
        """Tell whether what else drives a node leaves it to its charge."""
        switches = self._network.switches
        passes = self._single.get((node, polarity), [])
        opposite = (found[0], not found[1])
        alone = [part[0] for part in rest if len(part) == 1] + passes
        turned = [switches[index] for index in alone if switches[index].gate >= 0]
        if any(closing(switch, self._literals) == opposite for switch in turned):
            return False
        conditions = [
            {closing(switches[i], self._literals) for i in part if switches[i].gate >= 0}
            for part in rest
        ]
        others = {one for part in conditions for one in part} - {opposite}
        footed = bool(conditions) and all(opposite in part for part in conditions)
        if found[0] in self._clocks:
            return bool(passes or others)
        return bool(passes) or len(others) > 1 or (footed and bool(others))
