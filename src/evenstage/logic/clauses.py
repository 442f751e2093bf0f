"""Relations between nets as clauses for a SAT solver, before and after an edge."""

from __future__ import annotations

from importlib import import_module
from importlib.util import find_spec
from typing import TYPE_CHECKING

from evenstage.logic.cover import cover

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
    relations : mapping of int to Relation
        By the net they are of.
    moved : BoolArray, shape (nets,)
        Nets with values of their own before the edge.
    """

    def __init__(self, relations: Mapping[int, Relation], moved: BoolArray) -> None:
        self._moved = moved
        self._number: dict[tuple[int, bool], int] = {}
        self._clauses: list[list[int]] = []
        for net, relation in relations.items():
            for after in (True, False) if moved[net] else (True,):
                for value in (True, False):
                    for cube in cover(relation.table == value):
                        self._add(
                            [
                                -self._literal(relation.inputs[k], value=level, after=after)
                                for k, level in cube
                            ],
                            self._literal(net, value=value, after=after),
                        )

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
            if not (after and self._moved[net])
        }

    def _literal(self, net: int, *, value: bool, after: bool) -> int:
        key = (net, after or not self._moved[net])
        number = self._number.setdefault(key, len(self._number) + 1)
        return number if value else -number

    def _add(self, unless: list[int], then: int) -> None:
        self._clauses.append([*unless, then])
