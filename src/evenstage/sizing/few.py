"""The best set of a few cards: which of them to change when not all may change.

Sets are found from both ends, and every set that counts is optimised and certified for itself.

From all changes down: the Lagrangian of the answer (flow and prices fixed) says how much delay
grows if a size x goes back to 1. With A the sum of its terms that grow with x and B of those that
fall, that is ``A (1/x - 1) + B (x - 1)``, at least 0 at an optimum. Those that matter least for
each card go first; what is left is optimised anew. From nothing up: in the Lagrangian of the set
so far a size that stands at 1 could gain ``A + B - 2 sqrt(A B)``, bounds apart; of those that
promise most the best is taken. The better set of the two is improved by exchanging single cards,
then by pairs, since two gates in a row may each be of no use without the other. Going back and
forth is the usual remedy where choosing the very best set is a combinatorial problem (Hastie,
Tibshirani and Friedman, The Elements of Statistical Learning, 2nd ed. 2009, section 3.3). Where
there are few sets in all, each is tried.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import combinations
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import InfeasibleError, NotConvergedError
from evenstage.sizing.problem import totals
from evenstage.sizing.results import FewChanges, FewChangesPoint

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.sizing.engine import Engine
    from evenstage.sizing.problem import Problem
    from evenstage.sizing.solution import Solution

#: Relative change of a size below which its cards do not count as changed.
_STAYS: Final = 2e-3
#: Part of the sizes that goes at once while many are left; below so many they go one by one.
_AT_ONCE, _FEW = 0.15, 12
#: Of these so many are tried each time.
_DROPPED: Final = 4
#: Sets from nothing up are followed to so many cards, of so many candidates each time.
_FORWARD, _TRIED = 12, 3
#: Candidates in and out, and how many programmes, for exchanges.
_IN, _OUT, _EXCHANGES = 5, 3, 45
#: Monomials beyond which only the way down is gone.
_LARGE: Final = 20_000
#: Candidates in and programmes for exchanges of pairs, and up to how many monomials.
_PAIR_IN, _PAIRS, _PAIRS_LARGE = 7, 60, 4_000
#: Up to so many sets of so many monomials in all, every set is tried.
_SETS, _WORK = 300, 300_000
#: Relative gain that is one.
_GAIN: Final = 1e-4
_LEFT_ALONE = "left as it is, so that few cards change"


@dataclass(frozen=True)
class _Set:
    """Sizes that move, and the least delay they reach."""

    chosen: BoolArray
    solution: Solution


def choose_few(engine: Engine, count: int) -> tuple[Engine, FewChanges]:
    """Choose at most so many cards.

    Parameters
    ----------
    engine : Engine
        Of the block, with all that may move.
    count : int

    Returns
    -------
    engine : Engine
        In which all other sizes stay as they are.
    few : FewChanges

    Raises
    ------
    InfeasibleError
        Where the limits cannot be kept.
    NotConvergedError
        Where a proof fails.
    """
    return _Choice(engine, count).run()


def cards_of_sizes(engine: Engine) -> IntArray:
    """Return how many cards each size changes, as a report counts them, shape (sizes,)."""
    parts, circuit = engine.variables.partition, engine.model.circuit
    gate = circuit.gate_of_device[parts.first_device]
    pairs = np.unique(np.stack([parts.of_slot, gate]), axis=1)
    return np.bincount(pairs[0], minlength=len(parts)).astype(np.int32)


class _Choice:
    """One search."""

    def __init__(self, engine: Engine, count: int) -> None:
        self.engine, self.count = engine, count
        self.cards = cards_of_sizes(engine)
        self.fastest, self.lower, self.upper = engine.least_delay()
        self.problem: Problem = engine.problem(self.lower, self.upper)
        self.small = len(self.problem.delay.row) <= _LARGE
        #: The best set found of each number of cards.
        self.best: dict[int, _Set] = {}
        self.every_set_tried = False

    def run(self) -> tuple[Engine, FewChanges]:
        """Search."""
        self._down()
        if self._number_of_sets() <= min(_SETS, _WORK / max(len(self.problem.delay.row), 1)):
            self._try_every_set()
        elif self.small:
            self._up()
            self._exchange()
            self._exchange_pairs()
        found = self._within(self.count)
        chosen = found.chosen if found else np.zeros(len(self.lower), bool)
        variables = self.engine.variables
        reason = tuple(
            why or ("" if here else _LEFT_ALONE)
            for why, here in zip(variables.reason, chosen.tolist(), strict=True)
        )
        joint = self.engine.joint.with_variables(replace(variables, reason=reason))
        return replace(self.engine, joint=joint), self._curve()

    def _curve(self) -> FewChanges:
        points, today = [], self.engine.today.charged
        best = today
        for cards, some in sorted(self.best.items()):
            # A set of fewer cards is one of more cards too.
            best = min(best, some.solution.delay)
            points.append(FewChangesPoint(cards=cards, charged_delay=best))
        return FewChanges(
            asked=self.count,
            today_charged_delay=today,
            bound=self.fastest.bound,
            points=tuple(points),
            every_set_tried=self.every_set_tried,
        )

    def _number_of_sets(self) -> int:
        """Return how many sets there are of no more cards than asked for."""
        ways = np.zeros(self.count + 1)
        ways[0] = 1
        for cards in self.cards[self.lower < self.upper].tolist():
            if 0 < cards <= self.count:
                ways[cards:] += ways[: len(ways) - cards].copy()
        return int(min(ways.sum(), 1e9)) - 1

    def _try_every_set(self) -> None:
        """Optimise every set of no more cards than asked for."""
        movable = np.flatnonzero(self.lower < self.upper).tolist()
        start, known = np.ones(len(self.lower)), True
        for number in range(1, self.count + 1):
            for sizes in combinations(movable, number):
                if int(self.cards[list(sizes)].sum()) <= self.count:
                    some = self._solved(np.isin(np.arange(len(start)), sizes), start)
                    if some is not None:
                        self._keep(some)
                    else:
                        known = False
        self.every_set_tried = known

    def _down(self) -> None:
        """Drop what matters least until one size is left."""
        sizes = self.fastest.sizes
        chosen = (self.lower < self.upper) & (np.abs(np.log(sizes)) > _STAYS)
        some = _Set(chosen, self.fastest)
        while chosen.any():
            self._keep(some)
            inside = np.flatnonzero(chosen)
            worth = self._loss(some.solution)[inside] / self.cards[inside]
            many = len(inside) > max(_FEW, self.count if self.count < 4 * _FEW else 0)
            order = inside[np.argsort(worth, kind="stable")]
            if many:
                dropped = [order[: int(np.ceil(_AT_ONCE * len(inside)))]]
            else:
                # The Lagrangian sees one loss at a time; where few are left, solving says more.
                dropped = [order[place : place + 1] for place in range(min(_DROPPED, len(order)))]
            trials = [self._without(some, sizes) for sizes in dropped[: None if self.small else 1]]
            found = [trial for trial in trials if trial is not None]
            if not found:
                return
            some = min(found, key=lambda trial: trial.solution.delay)
            chosen = some.chosen

    def _without(self, some: _Set, sizes: IntArray) -> _Set | None:
        """Optimise a set without some of its sizes."""
        chosen = some.chosen.copy()
        chosen[sizes] = False
        return self._solved(chosen, some.solution.sizes)

    def _up(self) -> None:
        """Add what promises most until there are enough."""
        some = self._solved(np.zeros(len(self.lower), bool), np.ones(len(self.lower)))
        while some is not None and self._count(some) < min(self.count, _FORWARD):
            trials = [
                self._solved(some.chosen | self._only(size), some.solution.sizes)
                for size in self._promising(some, self.count - self._count(some))[:_TRIED]
            ]
            found = [trial for trial in trials if trial is not None]
            some = min(found, key=lambda trial: trial.solution.delay, default=None)
            if some is not None:
                self._keep(some)

    def _exchange(self) -> None:
        """Exchange single sizes of the best set while that helps."""
        left = _EXCHANGES
        while left > 0 and (some := self._within(self.count)) is not None:
            inside = np.flatnonzero(some.chosen)
            loss = self._loss(some.solution)[inside] / self.cards[inside]
            out = [-1, *inside[np.argsort(loss, kind="stable")[:_OUT]].tolist()]
            better = False
            for size in self._promising(some, self.count)[:_IN]:
                for gone in out:
                    chosen = some.chosen | self._only(size)
                    if gone >= 0:
                        chosen[gone] = False
                    if int(self.cards[chosen].sum()) > self.count:
                        continue
                    left -= 1
                    trial = self._solved(chosen, some.solution.sizes)
                    if trial and trial.solution.delay < some.solution.delay * (1 - _GAIN):
                        self._keep(trial)
                        better = True
                        break
                if better or left <= 0:
                    break
            if not better:
                return

    def _exchange_pairs(self) -> None:
        """Put two sizes at a time into the best set, and take out those that matter least then."""
        if len(self.problem.delay.row) > _PAIRS_LARGE:
            return
        left = _PAIRS
        while left > 0 and (some := self._within(self.count)) is not None:
            better = False
            for pair in combinations(self._missed(some), 2):
                left -= 2
                trial = self._exchanged(some, pair)
                if trial and trial.solution.delay < some.solution.delay * (1 - _GAIN):
                    self._keep(trial)
                    better = True
                if better or left <= 0:
                    break
            if not better:
                return

    def _missed(self, some: _Set) -> list[int]:
        """Return sizes that are not in a set but matter, for it or when all change."""
        worth = np.where(some.chosen, 0.0, self._loss(self.fastest))
        matter = np.argsort(-worth, kind="stable")[:_PAIR_IN].tolist()
        both = dict.fromkeys([*self._promising(some, self.count)[: _PAIR_IN // 2], *matter])
        return [size for size in both if worth[size] > 0][:_PAIR_IN]

    def _exchanged(self, some: _Set, pair: tuple[int, int]) -> _Set | None:
        """Optimise a set with two more sizes, then without those of it that matter least."""
        chosen = some.chosen.copy()
        chosen[list(pair)] = True
        wider = self._solved(chosen, some.solution.sizes)
        if wider is None:
            return None
        inside = np.flatnonzero(chosen)
        loss = self._loss(wider.solution)[inside] / self.cards[inside]
        for size in inside[np.argsort(loss, kind="stable")].tolist():
            if int(self.cards[chosen].sum()) <= self.count:
                break
            chosen[size] = False
        return self._solved(chosen, wider.solution.sizes) if chosen.any() else None

    def _keep(self, some: _Set) -> None:
        known = self.best.get(self._count(some))
        if known is None or some.solution.delay < known.solution.delay:
            self.best[self._count(some)] = some

    def _count(self, some: _Set) -> int:
        return int(self.cards[some.chosen].sum())

    def _within(self, count: int) -> _Set | None:
        """Return the fastest set found of at most so many cards."""
        sets = [some for cards, some in sorted(self.best.items()) if cards <= count]
        return min(sets, key=lambda some: some.solution.delay, default=None)

    def _only(self, size: int) -> BoolArray:
        only: BoolArray = np.arange(len(self.lower)) == size
        return only

    def _solved(self, chosen: BoolArray, start: FloatArray) -> _Set | None:
        """Optimise a set; None where it cannot keep the limits."""
        lower = np.where(chosen, self.lower, 1.0)
        upper = np.where(chosen, self.upper, 1.0)
        try:
            return _Set(chosen, self.engine.quickest(lower, upper, start))
        except (InfeasibleError, NotConvergedError):
            return None

    def _loss(self, solution: Solution) -> FloatArray:
        """Return how much delay is lost if each size alone goes back to 1, about, s."""
        grows, falls = self._weights(solution)
        x = solution.sizes
        loss: FloatArray = grows * (1 / x - 1) + falls * (x - 1)
        return loss

    def _promising(self, some: _Set, cards: int) -> list[int]:
        """Return the sizes outside a set by what they could gain, of at most so many cards."""
        grows, falls = self._weights(some.solution)
        best = np.sqrt(falls / np.maximum(grows, np.finfo(float).tiny))
        x = np.clip(best, self.lower, self.upper)
        gain = grows + falls - grows * x - falls / x
        allowed = ~some.chosen & (self.cards <= cards) & (gain > _GAIN * 1e-2 * self.fastest.delay)
        order = np.argsort(-gain, kind="stable")
        return [int(size) for size in order if allowed[size]]

    def _weights(self, solution: Solution) -> tuple[FloatArray, FloatArray]:
        """Return of each size the terms that grow with it and those that fall, s."""
        q, n = self.problem, len(solution.sizes)
        y = np.log(solution.sizes)
        grows, falls = np.zeros(n + 1), np.zeros(n + 1)
        for terms, price in ((q.delay, solution.flow), (q.limit, solution.limit_prices)):
            part = price[terms.row] * terms.values(y)
            grows += totals(terms.plus, part, n + 1)
            falls += totals(terms.minus, part, n + 1)
        return grows[:n] + solution.spend_price * q.spend * solution.sizes, falls[:n]
