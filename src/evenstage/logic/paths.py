"""Input vectors that make exactly one path switch, or the proof that it never does.

A vector pair differs in the path's start alone. It makes exactly the path switch if every net on
the path goes from the one value to the other, and every other input of a gate on it stays as it is:
static sensitisation, before and after (Roth, "Diagnosis of automata failures: a calculus and a
method", IBM Journal of Research and Development 10(4), 1966, from memory).

Where there is no such pair the path may still count together with others. It is false only if no
vector at all lets it: whatever the delays, and whatever the nets were before, the last event goes
along it only if at each gate, for the values at rest, the input on the path is one of some that
decide together and not without it (static co-sensitisation, Devadas, Keutzer and Malik,
"Computation of floating mode delay in combinational circuits", IEEE Transactions on CAD 12(12),
1993, from memory; for any gate, that is a prime implicant with the input's literal).

Both are asked of a SAT solver: tables of groups become clauses, or, where they have many inputs,
their ways to 1 and 0. What these leave open may be anything; so a false path stays proved, and a
vector is checked by switches before it is told. The search ends after a number of conflicts, so
that it ends alike everywhere.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise
from typing import TYPE_CHECKING, Final, Literal

import numpy as np

from evenstage.logic.clauses import Clauses
from evenstage.logic.evaluate import evaluate
from evenstage.logic.order import fan_in, fan_out, find_groups
from evenstage.logic.relations import Relation, Relations
from evenstage.logic.switches import UNKNOWN
from evenstage.logic.ways import WideRelation, phases

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.logic.switches import BoolArray, Switches

Verdict = Literal["switches", "false", "together", "unknown"]

GROUPS_MOST: Final = 4000
"""Paths that depend on more groups than this are not examined."""
_SHORTENED_MOST: Final = 64
"""Vectors of more inputs are told in full."""

PathNets = tuple[tuple[int, bool], ...]
"""Nets of a path from its start, each with whether it rises."""


@dataclass(frozen=True, slots=True, kw_only=True)
class PathVector:
    """What lets a path switch, or why nothing does.

    Parameters
    ----------
    verdict : {"switches", "false", "together", "unknown"}
        A vector pair was found; no vector lets it; no pair switches it alone; neither is known.
    held : tuple of (str, bool)
        Inputs that must be held, and at what; others do not matter.
    reason : str
        Where nothing is known: why.
    """

    verdict: Verdict
    held: tuple[tuple[str, bool], ...] = ()
    reason: str = ""


class PathLogic:
    """A block about whose paths one can ask.

    Parameters
    ----------
    switches : Switches
    given : BoolArray, shape (nets,)
        Nets decided from outside, supplies among them.
    """

    def __init__(self, switches: Switches, given: BoolArray) -> None:
        self._switches, self._given = switches, given
        self._groups = find_groups(switches, given)
        self._relations = Relations(switches, given, self._groups)

    def vector(self, path: PathNets, conflicts: int) -> PathVector:
        """Return what lets a path switch; the solver gives up after some conflicts."""
        nets = [net for net, _ in path]
        if not self._given[nets[0]] and self._groups.of_net[nets[0]] >= 0:
            return PathVector(verdict="unknown", reason="it starts inside the block")
        seeds = self._groups.of_net[nets[1:]]
        if (seeds < 0).any():
            return PathVector(verdict="unknown", reason="it leads through what is no group")
        cone = fan_in(self._groups, seeds)
        if cone.sum() > GROUPS_MOST:
            return PathVector(verdict="unknown", reason=f"it depends on {cone.sum()} groups")
        relations: dict[int, Relation | WideRelation] = {}
        for group in np.flatnonzero(cone).tolist():
            relations |= self._relations.of_group(group)
        heard = set(nets).union(*(one.inputs for one in relations.values()))
        before = _phases(relations)
        relations = {
            net: replace(one, phases=before) if isinstance(one, WideRelation) else one
            for net, one in relations.items()
            if net in heard
        }
        query = _Query(self, path, cone, relations, conflicts)
        return query.answer()

    def standing(self, path: PathNets, held: Mapping[int, bool]) -> dict[int, bool]:
        """Return what nets are worth that stand still as the path's start switches, by id.

        Looked at are those that decide the path, and what hangs on it.

        Parameters
        ----------
        path : PathNets
        held : mapping of int to bool
            What inputs are held at; the others are unknown.
        """
        nets = [net for net, _ in path]
        hung = self._groups.of_device[np.isin(self._switches.gate, nets)]
        seeds = np.concatenate([self._groups.of_net[nets[1:]], hung[hung >= 0]])
        part = self.part(fan_in(self._groups, seeds))
        start, rising = path[0]
        inputs = {
            net: np.full((2, 1), held.get(net, UNKNOWN), np.int8) for net in self.leaves(part)
        }
        inputs[start] = np.array([[not rising], [rising]], np.int8)
        before, after = evaluate(part, inputs, strong=False).values[:, :, 0].T
        still = np.flatnonzero((before == after) & (before != UNKNOWN) & (part.supply == UNKNOWN))
        return dict(zip(still.tolist(), (before[still] == 1).tolist(), strict=True))

    def affected(self, start: int, cone: BoolArray) -> BoolArray:
        """Tell which nets a start can move, shape (nets,)."""
        devices = (self._groups.of_device >= 0) & cone[self._groups.of_device]
        touched = devices & (
            (self._switches.gate == start)
            | (self._switches.drain == start)
            | (self._switches.source == start)
        )
        reached = fan_out(self._groups, self._groups.of_device[touched])
        moved: BoolArray = (self._groups.of_net >= 0) & reached[self._groups.of_net]
        moved[start] = True
        return moved

    def part(self, cone: BoolArray) -> Switches:
        """Return the switches of some groups."""
        return self._switches.some((self._groups.of_device >= 0) & cone[self._groups.of_device])

    def leaves(self, part: Switches) -> list[int]:
        """Return the nets that decide some switches and that none of them drives."""
        touched = np.unique(np.concatenate([part.drain, part.gate, part.source]))
        outside = (self._groups.of_net[touched] < 0) & (part.supply[touched] == UNKNOWN)
        found: list[int] = touched[outside].tolist()
        return found


def _phases(relations: Mapping[int, Relation | WideRelation]) -> dict[int, tuple[int, bool]]:
    """Return the nets that inverters and buffers make, each with the net they make it from."""
    tables = {net: one for net, one in relations.items() if isinstance(one, Relation)}
    return phases(
        {
            net: (one.inputs[0], bool(one.table[0]))
            for net, one in tables.items()
            if one.table.tolist() in ([0, 1], [1, 0])
        }
    )


@dataclass
class _Query:
    """One path under examination."""

    logic: PathLogic
    path: PathNets
    cone: BoolArray
    relations: Mapping[int, Relation | WideRelation]
    conflicts: int

    def answer(self) -> PathVector:
        """Return what was found."""
        moved = self.logic.affected(self.path[0][0], self.cone)
        if self._arcs() is None:
            reason = "it leads through a group with too many ways to the supplies"
            return PathVector(verdict="unknown", reason=reason)
        found = self._pair(moved)
        if isinstance(found, dict):
            return self._checked(found, moved)
        if found is None:
            return PathVector(verdict="unknown", reason="the search was given up")
        possible = self._possible()
        if possible is None:
            return PathVector(verdict="unknown", reason="the search was given up")
        return PathVector(verdict="together" if possible else "false")

    def _arcs(self) -> list[tuple[int, Relation | WideRelation]] | None:
        """Return position and relation of the path's input at each gate; None: not known."""
        arcs = []
        for (before, _), (after, _) in pairwise(self.path):
            relation = self.relations.get(after)
            if relation is None or before not in relation.inputs:
                return None
            if isinstance(relation, WideRelation) and relation.ways is None:
                return None
            arcs.append((relation.inputs.index(before), relation))
        return arcs

    @property
    def _sides(self) -> list[int]:
        """Inputs of the path's gates that are not on it."""
        on_path = {net for net, _ in self.path}
        return sorted(
            {net for at, _ in self.path[1:] for net in self.relations[at].inputs} - on_path
        )

    def _pair(self, moved: BoolArray) -> dict[int, bool] | bool | None:
        """Return values of nets before the start switches; False: there are none; None: unknown."""
        # First without nets that float or are fought over, for which the clauses may be wrong.
        for settled in (True, False):
            clauses = Clauses(self.relations, moved)
            for net, rising in self.path:
                clauses.fix(net, value=rising, after=True)
                clauses.fix(net, value=not rising, after=False)
            for net in self._sides:
                clauses.hold(net)
            if settled:
                clauses.settle()
            found = clauses.solve(self.conflicts)
            if isinstance(found, dict):
                break
        return found

    def _possible(self) -> bool | None:
        """Tell whether some vector lets the path decide; None: unknown."""
        clauses = Clauses(self.relations, np.zeros(len(self.logic.part(self.cone).supply), bool))
        for net, rising in self.path:
            clauses.fix(net, value=rising, after=True)
        for position, relation in self._arcs() or ():
            # Of many inputs, any is taken to matter anywhere.
            if isinstance(relation, Relation):
                clauses.forbid(relation, ~relation.matters(position))
        found = clauses.solve(self.conflicts)
        return None if found is None else found is not False

    def _checked(self, found: Mapping[int, bool], moved: BoolArray) -> PathVector:
        """Return a vector as far as it is needed, if switches confirm it."""
        part = self.logic.part(self.cone)
        start = self.path[0][0]
        held = {net: found.get(net, False) for net in self.logic.leaves(part) if net != start}
        nets = list(held)
        if not self._switches_with(part, moved, [held])[0]:
            return PathVector(verdict="unknown", reason="it needs a value stored before")
        if len(nets) <= _SHORTENED_MOST:
            alone = self._switches_with(
                part, moved, [{n: v for n, v in held.items() if n != left} for left in nets]
            )
            loose = [net for net, works in zip(nets, alone, strict=True) if works]
            for left in [loose, *([net] for net in loose)]:
                fewer = {net: value for net, value in held.items() if net not in left}
                if len(fewer) < len(held) and self._switches_with(part, moved, [fewer])[0]:
                    held = fewer
        names = self.logic.part(self.cone).names
        return PathVector(
            verdict="switches", held=tuple((names[net], value) for net, value in held.items())
        )

    def _switches_with(
        self, part: Switches, moved: BoolArray, held: Sequence[Mapping[int, bool]]
    ) -> list[bool]:
        """Tell for each of some vectors whether exactly the path switches, others unknown."""
        if not held:
            return []
        start, rising = self.path[0]
        inputs = {start: np.array([[not rising], [rising]], np.int8).repeat(len(held), axis=1)}
        for net in self.logic.leaves(part):
            if net != start:
                levels = [int(some[net]) if net in some else UNKNOWN for some in held]
                inputs[net] = np.array([levels, levels], np.int8)
        values = evaluate(part, inputs, strong=False).values
        works = np.ones(len(held), bool)
        for net, rises in self.path:
            works &= (values[net, 0] == (not rises)) & (values[net, 1] == rises)
        for net in self._sides:
            if moved[net]:
                works &= (values[net, 0] == values[net, 1]) & (values[net, 0] != UNKNOWN)
        return [bool(one) for one in works]
