"""Routes of a signal through a divided network, and what else moves with it.

A route leads from a node through passes that can conduct together to a driver. Drivers never fight:
an input setting that would join two that may differ is taken not to occur (of the drivers of a bus
one is enabled at a time), and dynamic nodes do not precharge. What hangs on a route through further
passes moves along; every setting of the inputs left free is looked at, and of those that move
comparable sets the largest is kept. On a line where very many passes meet, as on a bit line, one of
them at a time is taken to conduct but for those whose condition is known to hold: word lines and
selects come from decoders.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from evenstage.circuit.division import Driver
from evenstage.circuit.literals import Condition, Cube, consistent
from evenstage.circuit.network import HIGH, LOW

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.circuit.division import Division, Way

_STEPS_MAX = 50_000
"""Steps one group may take; a rotator of 32 lanes in five ranks takes 4,000."""


_TOLD_APART = 8
"""Conditions that may exclude each other up to which sets of nodes beside a route are told apart.

With more of them everything that moves in some setting is taken together: an upper bound.
"""


_WIDE = 16
"""So many links at one node make it a line: what else may hang there is not told apart."""
_LEGS_MOST = 32
"""With more pull networks on a line their inner nodes hang on it one network at a time, too."""


class TooManyRoutesError(Exception):
    """A network with more routes than are looked at."""


@dataclass(frozen=True, slots=True)
class Route:
    """A way from a node through passes to a driver.

    Parameters
    ----------
    nodes : tuple of int
        From the node to that of the driver.
    passes : tuple of int
        Between them, in the same order.
    driver : Driver
    cube : Cube
        When all passes conduct.
    """

    nodes: tuple[int, ...]
    passes: tuple[int, ...]
    driver: Driver
    cube: Cube


class Router:
    """The routes of one divided network.

    Parameters
    ----------
    division : Division

    Attributes
    ----------
    is_bounded : bool
        Whether somewhere an upper bound was taken for what moves.
    lines : dict of int to int
        Nodes where one pass or pull network at a time is taken to conduct, and of how many.
    """

    def __init__(self, division: Division) -> None:
        self._division = division
        self._steps = 0
        self.is_bounded = False
        self.lines: dict[int, int] = {}
        self._wide = {n for n, some in division.links_at.items() if len(some) > _WIDE}
        self._inner = {node: self._inner_nodes(node) for node in self._wide}

    def routes(self, node: int) -> Iterator[Route]:
        """Yield the routes to a node that can conduct, in drawing order.

        Raises
        ------
        TooManyRoutesError
        """
        division = self._division
        off = division.off.get(node, frozenset[Condition]())
        stack: list[tuple[tuple[int, ...], tuple[int, ...], Cube]] = [((node,), (), off)]
        while stack:
            self._step()
            nodes, passes, cube = stack.pop()
            here = nodes[-1]
            drivers = division.drivers_at.get(here, ())
            for driver in drivers:
                yield Route(nodes, passes, driver, cube)
            if any(driver.always for driver in drivers):
                continue
            for index in reversed(division.passes_at.get(here, ())):
                one = division.passes[index]
                far = one.other(here)
                wider = consistent(cube, () if one.condition is None else (one.condition,))
                if wider is not None:
                    wider = consistent(wider, division.off.get(far, ()))
                if far not in nodes and wider is not None:
                    stack.append(((*nodes, far), (*passes, index), wider))

    def beside(
        self, depth: dict[int, int], route: Route, way: Way, supply: int
    ) -> list[dict[int, int]]:
        """Return the sets of nodes that can move with a route; each with its depth.

        A node that another driver holds at the same supply is there with depth 0.

        Parameters
        ----------
        depth : dict of int to int
            Nodes of the route with the number of steps, from the supply, that charge them.
        route : Route
        way : Way
            Of its driver, to the supply.
        supply : int

        Raises
        ------
        TooManyRoutesError
        """
        cube = consistent(route.cube, way.cube)
        if cube is None:
            return []
        tied = self._along_lines(self._tied(depth, cube, route), route)
        if not self._can_be(tied, cube, route.driver, supply):
            return []
        most, conditions = self._all_beside(tied, cube, route, supply)
        everything = consistent(cube, conditions)
        if everything is not None:
            together = self._tied(most, everything, route)
            if self._can_be(together, everything, route.driver, supply):
                return [together]
        if len(conditions) > _TOLD_APART:
            self.is_bounded = True
            return [most]
        return self._each_beside(tied, cube, route, supply)

    def _each_beside(
        self, tied: dict[int, int], cube: Cube, route: Route, supply: int
    ) -> list[dict[int, int]]:
        """Return the largest sets of nodes that move together in some setting."""
        found: list[dict[int, int]] = []
        waiting = [(tied, cube)]
        while waiting:
            self._step()
            nodes, known = waiting.pop()
            if not self._can_be(nodes, known, route.driver, supply):
                continue
            link = next(self._undecided(nodes, known, route), None)
            if link is None:
                found.append(nodes)
                continue
            closed, near, far = link
            off = known | {_opposite(closed)}
            waiting.append((self._tied(nodes, off, route), off))
            wider = {**nodes, far: self._depth(far, nodes[near])}
            waiting.append((self._tied(wider, known | {closed}, route), known | {closed}))
        return _largest(found)

    def _all_beside(
        self, tied: dict[int, int], cube: Cube, route: Route, supply: int
    ) -> tuple[dict[int, int], Cube]:
        """Return every node that can move with a route in some setting, and what ties them."""
        nodes, conditions = dict(tied), set[Condition]()
        growing = True
        while growing:
            growing = False
            for closed, near, far in list(self._undecided(nodes, cube, route)):
                self._step()
                known = cube | {closed}
                wider = {**tied, far: self._depth(far, nodes[near])}
                wider = self._tied(wider, known, route)
                if far not in nodes and self._can_be(wider, known, route.driver, supply):
                    nodes |= {node: depth for node, depth in wider.items() if node not in nodes}
                    conditions.add(closed)
                    growing = True
        return nodes, frozenset(conditions)

    def _tied(self, nodes: dict[int, int], known: Cube, route: Route) -> dict[int, int]:
        """Return some nodes with all that links known to conduct tie to them."""
        found = dict(nodes)
        growing = True
        while growing:
            growing = False
            for condition, near, far in list(self._hanging(found, route)):
                if condition is None or condition in known:
                    found.setdefault(far, self._depth(far, found[near]))
                    growing = True
        return found

    def _inner_nodes(self, line: int) -> dict[Driver, list[int]]:
        """Return the inner nodes of the pull networks on a line, by driver."""
        links = self._division.links_at
        found: dict[Driver, list[int]] = {}
        for link in links[line]:
            if isinstance(link.owner, Driver) and link.owner.node == line:
                reached = found.setdefault(link.owner, [])
                waiting = [link.other(line)]
                while waiting:
                    node = waiting.pop()
                    if node not in reached:
                        reached.append(node)
                        waiting += [
                            far.other(node)
                            for far in links[node]
                            if far.owner is link.owner and far.other(node) != line
                        ]
        return found

    def _along_lines(self, nodes: dict[int, int], route: Route) -> dict[int, int]:
        """Return nodes with the inner nodes of what hangs on wide ones, an upper bound."""
        found = dict(nodes)
        for line in self._wide & nodes.keys():
            passes = len(self._division.passes_at.get(line, ()))
            inner = self._inner[line]
            if passes > _WIDE:
                self.lines[line] = passes
            if len(inner) > _LEGS_MOST:
                self.lines[line] = max(len(inner), self.lines.get(line, 0))
            elif any(driver is not route.driver for driver in inner) and nodes[line]:
                self.is_bounded = True
                for driver, some in inner.items():
                    if driver is not route.driver:
                        found |= {node: nodes[line] for node in some if node not in found}
        return found

    def _undecided(
        self, nodes: dict[int, int], known: Cube, route: Route
    ) -> Iterator[tuple[Condition, int, int]]:
        """Yield the links that may tie further nodes: condition, near and far end."""
        for condition, near, far in self._hanging(nodes, route, undecided=True):
            if condition is not None and not known & {condition, _opposite(condition)}:
                yield condition, near, far

    def _depth(self, node: int, near: int) -> int:
        """Return the depth of a node tied to another: 0 where a driver holds it."""
        held = any(driver.always for driver in self._division.drivers_at.get(node, ()))
        return 0 if held else near

    def _hanging(
        self, nodes: dict[int, int], route: Route, *, undecided: bool = False
    ) -> Iterator[tuple[Condition | None, int, int]]:
        """Yield the links that lead from moving nodes to others: condition, near and far end.

        What hangs inside the route's own driver depends on the edge and is known there; on a line
        nothing is undecided.
        """
        for near, depth in nodes.items():
            for link in self._division.links_at.get(near, ()) if depth else ():
                if undecided and near in self._wide:
                    continue
                far = link.other(near)
                if far not in nodes and link.owner is not route.driver:
                    yield link.condition, near, far

    def _can_be(self, nodes: dict[int, int], known: Cube, own: Driver, supply: int) -> bool:
        """Tell whether no other driver of some nodes need conduct, nor this one the other way.

        One that always drives is let be where it is known to pull the same way.
        """
        against = LOW if supply == HIGH else HIGH
        clauses = [way.cube for way in own.ways(against)]
        for node in nodes:
            for driver in self._division.drivers_at.get(node, ()):
                if node in self._wide and not driver.always:
                    continue
                if driver.always and driver is not own:
                    if not all(_is_off(way.cube, known) for way in driver.ways(against)):
                        return False
                elif driver is not own:
                    clauses += [way.cube for way in (*driver.up, *driver.down)]
        return self._all_off(clauses, known)

    def _all_off(self, cubes: Sequence[Cube], known: Cube) -> bool:
        """Tell whether inputs not known yet can be chosen so that none of some cubes holds."""
        for place, cube in enumerate(cubes):
            if _is_off(cube, known):
                continue
            return any(
                self._all_off(cubes[place + 1 :], known | {(net, not value)})
                for net, value in sorted(cube - known)
            )
        return True

    def _step(self) -> None:
        self._steps += 1
        if self._steps > _STEPS_MAX:
            raise TooManyRoutesError


def _opposite(condition: Condition) -> Condition:
    return condition[0], not condition[1]


def _is_off(cube: Cube, known: Cube) -> bool:
    return any((net, not value) in known for net, value in cube)


def _largest(found: list[dict[int, int]]) -> list[dict[int, int]]:
    """Drop the sets that another one holds, of equal ones the later."""
    return [
        nodes
        for place, nodes in enumerate(found)
        if not any(
            nodes.items() <= other.items() and (nodes != other or at < place)
            for at, other in enumerate(found)
            if at != place
        )
    ]
