"""The parts of a divided group: what drives its nodes, and what passes signals between them."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

from evenstage.circuit.network import HIGH

if TYPE_CHECKING:
    from evenstage.circuit.function import Expression
    from evenstage.circuit.gate import ArcForm
    from evenstage.circuit.literals import Condition, Cube, Literals
    from evenstage.circuit.network import Network, Switch


@dataclass(frozen=True, slots=True)
class Way:
    """One conducting path from a driver's node to a supply, and when it conducts.

    ``beside`` are as long paths through switches of the same inputs: they conduct whenever it does.
    """

    path: tuple[int, ...]
    cube: Cube
    beside: tuple[tuple[int, ...], ...] = ()


@dataclass(frozen=True, eq=False)
class Driver:
    """What pulls one node: a pull network, or the outside (without switches).

    Parameters
    ----------
    node : int
    switches : tuple of int
        Of the whole network.
    up, down : tuple of Way
    arcs : tuple of ArcForm
        With switches of the whole network.
    kind : str
    function : Expression
        Its value, and when it drives.
    always : bool
        Whether it drives under all inputs.
    """

    node: int
    switches: tuple[int, ...]
    up: tuple[Way, ...]
    down: tuple[Way, ...]
    arcs: tuple[ArcForm, ...]
    kind: str
    function: Expression
    always: bool

    @property
    def is_outside(self) -> bool:
        """Whether the signal comes from outside the block."""
        return not self.switches

    def ways(self, supply: int) -> tuple[Way, ...]:
        """Return the paths to one supply."""
        return self.up if supply == HIGH else self.down


@dataclass(frozen=True, eq=False)
class Pass:
    """Switches in parallel that pass a signal between two terminals.

    Parameters
    ----------
    ends : (int, int)
    n, p : tuple of int
        Switches of either polarity.
    condition : Condition, optional
        When it conducts; None: always.
    """

    ends: tuple[int, int]
    n: tuple[int, ...]
    p: tuple[int, ...]
    condition: Condition | None

    @property
    def switches(self) -> tuple[int, ...]:
        """All its switches."""
        return (*self.n, *self.p)

    @property
    def kind(self) -> str:
        """Transmission gate or pass transistor."""
        return "transmission gate" if self.n and self.p else "pass transistor"

    def other(self, node: int) -> int:
        """Return the end that is not ``node``."""
        return self.ends[1] if node == self.ends[0] else self.ends[0]


@dataclass(frozen=True, eq=False)
class Link:
    """What may tie two nodes: a pass, or a switch inside the pull network of a driver.

    Parameters
    ----------
    ends : (int, int)
    condition : Condition, optional
        When it does; None: always.
    owner : Pass or Driver
    """

    ends: tuple[int, int]
    condition: Condition | None
    owner: Pass | Driver

    def other(self, node: int) -> int:
        """Return the end that is not ``node``."""
        return self.ends[1] if node == self.ends[0] else self.ends[0]


@dataclass(frozen=True, slots=True)
class Charging:
    """What precharges a node: parallel switches to a supply that one condition closes.

    Parameters
    ----------
    node, supply : int
    switches : tuple of int
    condition : Condition
    """

    node: int
    supply: int
    switches: tuple[int, ...]
    condition: Condition

    @property
    def off(self) -> Cube:
        """The condition of evaluation."""
        return frozenset({(self.condition[0], not self.condition[1])})


@dataclass(frozen=True)
class Division:
    """A network divided.

    Parameters
    ----------
    network : Network
    literals : Literals
    drivers : tuple of Driver
    passes : tuple of Pass
    assumed : tuple of (int, int)
        Inputs of switches in parallel taken for complements without proof.
    charging : tuple of Charging
        What precharges nodes; no drivers.
    """

    network: Network
    literals: Literals
    drivers: tuple[Driver, ...]
    passes: tuple[Pass, ...]
    assumed: tuple[tuple[int, int], ...]
    charging: tuple[Charging, ...] = ()

    @cached_property
    def off(self) -> dict[int, Cube]:
        """When dynamic nodes may evaluate, by node."""
        return {one.node: one.off for one in self.charging}

    @cached_property
    def drivers_at(self) -> dict[int, list[Driver]]:
        """Drivers by node."""
        found: dict[int, list[Driver]] = {}
        for driver in self.drivers:
            found.setdefault(driver.node, []).append(driver)
        return found

    @cached_property
    def links_at(self) -> dict[int, list[Link]]:
        """Links by node; those to supplies are left out."""
        links = [Link(one.ends, one.condition, one) for one in self.passes]
        for driver in self.drivers:
            for index in driver.switches:
                switch = self.network.switches[index]
                if switch.a >= 0 and switch.b >= 0:
                    condition = closing(switch, self.literals)
                    links.append(Link((switch.a, switch.b), condition, driver))
        found: dict[int, list[Link]] = {}
        for link in links:
            for end in link.ends:
                found.setdefault(end, []).append(link)
        return found

    @cached_property
    def passes_at(self) -> dict[int, list[int]]:
        """Indices of passes by node."""
        found: dict[int, list[int]] = {}
        for index, one in enumerate(self.passes):
            for end in one.ends:
                found.setdefault(end, []).append(index)
        return found


def closing(switch: Switch, literals: Literals) -> Condition:
    """Return when a switch conducts."""
    return literals.condition(switch.gate, value=switch.polarity == "n")
