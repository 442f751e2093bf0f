"""What each limit costs: how much a little more room would buy.

In the logarithm of a limit the optimum is convex, so its multiplier gives not only the first order
of what a change buys but the most it can buy (Boyd and Vandenberghe, Convex Optimization, 2004,
section 5.6): a limit with price kappa, let out by a tenth, buys at most ``kappa log 1.1``. The
price of a bound on a size is the slope of the Lagrangian there. A limit that leaves no room is
taken out before the optimiser sees it; then its price is what the sizes it holds would pay for
their share of it.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.sizing.results import LimitPrice

if TYPE_CHECKING:
    from collections.abc import Iterator

    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray
    from evenstage.sizing.engine import Continuous, Engine
    from evenstage.sizing.results import PricedLimit

#: By how much a limit is let out, in its logarithm: ten percent.
_TENTH: Final = float(np.log(1.1))
#: Least part of the goal that is worth telling, and how many limits are told.
_WORTH: Final = 1e-4
_MOST: Final = 40
_AT_BOUND: Final = 1e-4


def limit_prices(engine: Engine, answer: Continuous) -> tuple[LimitPrice, ...]:
    """Return what limits would buy if they were ten percent wider, the dearest first.

    Parameters
    ----------
    engine : Engine
    answer : Continuous
        Its answer. Prices are in delay, or in spend where the least spend for a delay was asked
        for.
    """
    on_spend = engine.wishes.delay is not None
    proof = answer.solution if on_spend else answer.fastest
    if on_spend and not 0 < proof.spend_price < np.inf:
        return ()
    # Prices of delay are seconds; what a second costs turns them into spend.
    rate = 1 / proof.spend_price if on_spend else 1.0
    goal = proof.spend if on_spend else proof.delay
    found = [
        LimitPrice(limit=limit, name=name, buys=price * rate * _TENTH)
        for limit, name, price in _Prices(engine, answer, on_spend=on_spend).every()
        if price * rate * _TENTH > _WORTH * abs(goal)
    ]
    return tuple(sorted(found, key=lambda price: -price.buys)[:_MOST])


class _Prices:
    """The prices of one answer, s per unit of a limit's logarithm."""

    def __init__(self, engine: Engine, answer: Continuous, *, on_spend: bool) -> None:
        self.engine, self.answer = engine, answer
        self.proof = answer.solution if on_spend else answer.fastest
        self.on_spend = on_spend
        self.problem = engine.problem(answer.lower, answer.upper, answer.limits)
        self.slope = self._slope()

    def every(self) -> Iterator[tuple[PricedLimit, str, float]]:
        """Give each limit with its name and its price."""
        yield from self._inputs()
        yield from self._widths()
        yield (
            "transition",
            "",
            sum(
                float(self.proof.limit_prices[corner.rows][len(corner.limits.ceiling_net) :].sum())
                for corner in self.engine.corners
            ),
        )
        yield from self._skews()
        if self.engine.wishes.width is not None and not self.on_spend:
            yield "budget", "", self.proof.spend_price * self.proof.spend

    def _slope(self) -> FloatArray:
        """Return the slope of the Lagrangian in each log size, s."""
        q, proof = self.problem, self.proof
        y = np.log(proof.sizes)
        slope: FloatArray = q.delay.gradient(y, proof.flow)
        slope = slope + q.limit.gradient(y, proof.limit_prices)
        return slope + proof.spend_price * q.spend * proof.sizes

    def _inputs(self) -> Iterator[tuple[PricedLimit, str, float]]:
        """Give each input with its price over all corners: its ceiling is let out in each."""
        names = self.engine.model.circuit.devices.net_names
        variables = self.engine.variables
        room = variables.free & (self.proof.sizes < variables.upper * (1 - _AT_BOUND))
        held = np.where(room & (self.answer.lower < self.answer.upper), -self.slope, 0.0)
        share = self.problem.limit.values(np.log(self.proof.sizes))
        full = self.answer.full if self.on_spend else self._full()
        total: dict[int, tuple[float, float]] = {}
        for corner in self.engine.corners:
            for row, net in enumerate(corner.limits.ceiling_net.tolist(), corner.rows.start):
                price, forced = total.get(net, (0.0, 0.0))
                price += float(self.proof.limit_prices[row])
                if full[row]:
                    # One corner's ceiling forces the sizes; those of others only repeat it.
                    forced = max(forced, self._forced(row, held, share))
                total[net] = price, forced
        for net, (price, forced) in total.items():
            yield "input", names[net], price + forced

    def _forced(self, row: int, held: FloatArray, share: FloatArray) -> float:
        """Return what the sizes that a limit without room holds would pay for it, s."""
        limit, n = self.problem.limit, len(self.slope)
        mine = np.flatnonzero((limit.row == row) & (limit.plus < n))
        wanted = held[limit.plus[mine]] / np.maximum(share[mine], 1e-9)
        return float(wanted.max(initial=0.0))

    def _skews(self) -> Iterator[tuple[PricedLimit, str, float]]:
        """Give each bound of a gate's skew."""
        skews = self.engine.variables.skews
        if skews is None:
            return
        names = self._names()
        price = self.proof.limit_prices[self.engine.corners[-1].rows.stop :].reshape(2, -1)
        for down, paid in zip(skews.down.tolist(), price.sum(axis=0).tolist(), strict=True):
            yield "skew", names[down], paid

    def _names(self) -> list[str]:
        """Return the name of a gate of each size."""
        circuit, parts = self.engine.model.circuit, self.engine.variables.partition
        _, slots = np.unique(parts.of_slot, return_index=True)
        gates = circuit.gate_of_device[parts.first_device[slots]]
        return [circuit.gate_name(gate) for gate in gates.tolist()]

    def _full(self) -> BoolArray:
        """Return which limits the fastest answer uses up."""
        sums = self.problem.limit_sums(self.proof.sizes)
        full: BoolArray = sums > 1 - _AT_BOUND / 10
        return full

    def _widths(self) -> Iterator[tuple[PricedLimit, str, float]]:
        """Give the bounds of sizes, and the sizes that must stay as they are."""
        variables, x = self.engine.variables, self.proof.sizes
        names, side = self._names(), variables.partition.side
        for size in np.flatnonzero(np.abs(self.slope) > 0).tolist():
            slope, name = float(self.slope[size]), names[size]
            if variables.skews is not None and size in variables.skews.down:
                name += ", pull-down"
            elif side[size]:
                name += ", pull-up"
            if not variables.free[size]:
                yield ("fixed", name, abs(slope))
            elif slope < 0 and x[size] >= variables.upper[size] * (1 - _AT_BOUND):
                yield ("greatest width", name, -slope)
            elif slope > 0 and x[size] <= variables.lower[size] * (1 + _AT_BOUND):
                yield ("least width", name, slope)
