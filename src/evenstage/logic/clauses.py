"""Relations between nets as clauses for a SAT solver, before and after an edge."""

from __future__ import annotations

from importlib import import_module
from importlib.util import find_spec
from typing import TYPE_CHECKING

from evenstage.logic.cover import cover
from evenstage.logic.switches import UNKNOWN
from evenstage.logic.ways import WideRelation

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.logic.relations import Relation
    from evenstage.logic.switches import BoolArray


def has_solver() -> bool:
    """Tell whether the SAT library is installed."""
    return find_spec("pysat") is not None


class Clauses:
    """What must hold of nets that move with an edge, twice, and of all others, once.

    Parameters
    ----------
    relations : mapping of int to Relation or WideRelation
        By the net they are of.
    moved : BoolArray, shape (nets,)
        Nets with values of their own before the edge.
    """

    def __init__(self, relations: Mapping[int, Relation | WideRelation], moved: BoolArray) -> None:
        self._moved = moved
        self._number: dict[tuple[int, bool], int] = {}
        self._clauses: list[list[int]] = []
        self._settled: list[list[int]] = []
        for net, relation in relations.items():
            for after in (True, False) if moved[net] else (True,):
                if isinstance(relation, WideRelation):
                    self._by_ways(relation, after=after)
                else:
                    self._by_table(net, relation, after=after)

    def _by_table(self, net: int, relation: Relation, *, after: bool) -> None:
        """Say what a net is for the inputs of its table."""
        for cube in cover(relation.table == UNKNOWN):
            self._settled.append(
                [-self._literal(relation.inputs[k], value=level, after=after) for k, level in cube]
            )
        for value in (True, False):
            for cube in cover(relation.table == value):
                self._add(
                    [
                        -self._literal(relation.inputs[k], value=level, after=after)
                        for k, level in cube
                    ],
                    self._literal(net, value=value, after=after),
                )

    def _by_ways(self, relation: WideRelation, *, after: bool) -> None:
        """Say what a net is by its ways (Tseitin 1968, from memory): one number for each of them.

        A number is true only if its way is closed and leads to that level.
        """
        to: dict[bool, int] = {}
        for value in (True, False):
            numbers = []
            for way in relation.ways or ():
                literals = [
                    self._literal(net, value=level, after=after) for net, level in way.closing
                ]
                if way.level == UNKNOWN:
                    literals.append(self._literal(way.net, value=value, after=after))
                elif bool(way.level) != value:
                    continue
                numbers.append(self._fresh())
                self._clauses += [[-numbers[-1], literal] for literal in literals]
                self._clauses.append([*(-literal for literal in literals), numbers[-1]])
            to[value] = self._fresh()
            self._clauses.append([-to[value], *numbers])
            self._clauses += [[-number, to[value]] for number in numbers]
        if relation.ways is not None:
            for value in (True, False):
                own = self._literal(relation.net, value=value, after=after)
                self._clauses.append([-to[value], to[not value], own])
                self._settled.append([to[True], to[False]] if value else [-to[True], -to[False]])

    def fix(self, net: int, *, value: bool, after: bool) -> None:
        """Give a net a value."""
        self._add([], self._literal(net, value=value, after=after))

    def hold(self, net: int) -> None:
        """Keep a net as it is."""
        if self._moved[net]:
            before, after = (self._literal(net, value=True, after=when) for when in (False, True))
            self._add([-before], after)
            self._add([before], -after)

    def forbid(self, relation: Relation, where: BoolArray) -> None:
        """Forbid vectors of a relation's inputs after the edge."""
        for cube in cover(where):
            self._clauses.append(
                [-self._literal(relation.inputs[k], value=level, after=True) for k, level in cube]
            )

    def settle(self) -> None:
        """Let no net float, be fought over, or need what was stored before."""
        self._clauses += self._settled

    def solve(self, conflicts: int) -> dict[int, bool] | bool | None:
        """Return values of all nets before the edge; False: there are none; None: given up."""
        # Loaded when somebody asks: the command line must start at once.
        solvers = import_module("pysat.solvers")
        with solvers.Solver(name="glucose4", bootstrap_with=self._clauses) as solver:
            solver.conf_budget(conflicts)
            found = solver.solve_limited()
            if found is None:
                return None
            if not found:
                return False
            true = {literal for literal in solver.get_model() if literal > 0}
        return {
            net: number in true
            for (net, after), number in self._number.items()
            if net >= 0 and not (after and self._moved[net])
        }

    def _fresh(self) -> int:
        """Return a number that stands for no net."""
        number = len(self._number) + 1
        self._number[-number, True] = number
        return number

    def _literal(self, net: int, *, value: bool, after: bool) -> int:
        key = (net, after or not self._moved[net])
        number = self._number.setdefault(key, len(self._number) + 1)
        return number if value else -number

    def _add(self, unless: list[int], then: int) -> None:
        self._clauses.append([*unless, then])
