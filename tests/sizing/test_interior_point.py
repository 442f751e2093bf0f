"""The optimiser: goals, limits, edge cases and what it refuses."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal

from evenstage.errors import NoPathError, NotConvergedError
from evenstage.sizing.certificate import check
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.infeasible import (
    BudgetTooSmallError,
    DelayOutOfReachError,
    LimitOutOfReachError,
)
from evenstage.sizing.interior_point import solve
from evenstage.sizing.problem import Problem, worst_delay
from support.problems import Arc, Term, chain_problem, problem, random_problem


def inverters(count: int, load: float) -> Problem:
    """Return a plain chain."""
    ones = [1.0] * count
    return chain_problem(ones, ones, ones, 1, load)


def seeds() -> st.SearchStrategy[int]:
    return st.integers(0, 10**6)


class TestFastest:
    @given(seed=seeds(), gates=st.integers(3, 25))
    @settings(max_examples=25)
    def test_beats_every_other_choice_of_sizes(self, seed: int, gates: int) -> None:
        question = random_problem(seed, gates, depth=4)
        answer = solve(question, Fastest())
        assert check(question, Fastest(), answer).gap < 1e-6
        rng = np.random.default_rng(seed)
        for _ in range(20):
            other = np.exp(np.log(answer.sizes) + rng.normal(0, 0.2, gates))
            other = np.clip(other, question.lower, question.upper)
            if question.limit_sums(other).max(initial=0.0) <= 1.0:
                assert worst_delay(question, other) >= answer.bound

    def test_answer_does_not_depend_on_the_start(self) -> None:
        question = random_problem(5, 30, depth=6)
        rng = np.random.default_rng(9)
        starts = [question.lower, question.upper, rng.uniform(1, 64, 30), np.full(30, 1e9)]
        delays = [solve(question, Fastest(), start=start).delay for start in starts]
        assert_allclose(delays, delays[0], rtol=2e-9, atol=0)

    @pytest.mark.parametrize("scale", [1e-15, 1e-9, 1e6])
    def test_unit_of_time_does_not_matter(self, scale: float) -> None:
        question = random_problem(6, 20, depth=5)
        delay = replace(question.delay, coefficient=scale * question.delay.coefficient)
        answer = solve(replace(question, delay=delay), Fastest())
        assert_allclose(answer.delay, scale * solve(question, Fastest()).delay, rtol=2e-9, atol=0)

    def test_delays_of_very_different_length(self) -> None:
        question = random_problem(6, 30, depth=5)
        decades = 10 ** np.random.default_rng(3).uniform(-6, 0, len(question.arc_source))
        coefficient = question.delay.coefficient * decades[question.delay.row]
        question = replace(question, delay=replace(question.delay, coefficient=coefficient))
        answer = solve(question, Fastest())
        assert check(question, Fastest(), answer).gap < 1e-6

    def test_size_that_nothing_depends_on_stays(self) -> None:
        chain: list[Term] = [(1.0, 0, None), (16.0, None, 0)]
        aside: list[Term] = [(0.1, None, 1), (0.1, 1, None)]
        question = problem(
            [Arc(0, 1, chain), Arc(0, 2, aside)],
            [1, 1],
            [100, 100],
            starts={0: 0.0},
            ends={1: 0.0, 2: 0.0},
        )
        answer = solve(question, Fastest(), start=[7.0, 13.0])
        assert_allclose(answer.sizes, [4.0, 13.0], rtol=1e-6, atol=0)

    def test_size_on_its_bound_is_exactly_there(self) -> None:
        question = inverters(3, 1000.0)
        question = replace(question, upper=np.minimum(question.upper, 5.0))
        answer = solve(question, Fastest())
        assert answer.sizes[2] == 5.0
        assert_allclose(answer.sizes[1], np.sqrt(5.0), rtol=1e-6, atol=0)


class TestCheapest:
    @given(seed=seeds())
    @settings(max_examples=15)
    def test_meets_the_delay_it_was_given(self, seed: int) -> None:
        question = random_problem(seed, 15, depth=4)
        fastest = solve(question, Fastest())
        goal = Cheapest(1.01 * fastest.delay)
        answer = solve(question, goal, start=question.lower)
        assert answer.delay <= goal.delay
        assert answer.spend <= fastest.spend * (1 + 1e-9)
        assert check(question, goal, answer).gap < 1e-6

    @pytest.mark.parametrize("slack", [1e-6, 1e-4, 0.3])
    def test_near_the_least_delay_and_far_from_it(self, slack: float) -> None:
        question = random_problem(17, 40, depth=8)
        fastest = solve(question, Fastest())
        goal = Cheapest((1 + slack) * fastest.delay)
        answer = solve(question, goal, start=fastest.sizes)
        assert answer.delay <= goal.delay
        assert check(question, goal, answer).gap < 1e-6

    def test_of_an_easy_delay_is_the_smallest_sizes(self) -> None:
        question = random_problem(18, 20, depth=5)
        easy = 1.5 * worst_delay(question, question.lower)
        answer = solve(question, Cheapest(easy), start=question.upper)
        assert_array_equal(answer.sizes, question.lower)
        assert answer.spend_price > 0

    def test_trade_off_is_monotone_and_convex(self) -> None:
        question = random_problem(19, 25, depth=6)
        least = solve(question, Fastest()).delay
        delays = least * np.array([1.01, 1.05, 1.1, 1.2, 1.4, 1.8])
        spends = np.array([solve(question, Cheapest(float(d))).spend for d in delays])
        slopes = np.diff(spends) / np.diff(delays)
        assert np.all(slopes < 0)
        assert np.all(np.diff(slopes) > 0)

    def test_refuses_a_delay_out_of_reach(self) -> None:
        question = inverters(4, 256.0)
        with pytest.raises(DelayOutOfReachError) as caught:
            solve(question, Cheapest(19.0))
        assert_allclose(caught.value.least, 20.0, rtol=1e-8, atol=0)
        assert caught.value.asked == 19.0
        assert str(caught.value) == (
            "a delay of 19.00 s is out of reach: the least possible with these limits is 20.00 s, "
            "1.00 s more (delay-out-of-reach)"
        )


class TestBudget:
    @given(seed=seeds(), part=st.floats(0.01, 0.9))
    @settings(max_examples=15)
    def test_spends_no_more_than_it_may(self, seed: int, part: float) -> None:
        question = random_problem(seed, 15, depth=4)
        least = question.cost(question.lower)
        goal = Budget(least + part * (solve(question, Fastest()).spend - least))
        answer = solve(question, goal)
        assert answer.spend <= goal.spend
        assert check(question, goal, answer).gap < 1e-6

    def test_undoes_what_cheapest_does(self) -> None:
        question = random_problem(20, 60, depth=8)
        fastest = solve(question, Fastest())
        cheapest = solve(question, Cheapest(1.1 * fastest.delay))
        within = solve(question, Budget(cheapest.spend))
        assert_allclose(within.delay, 1.1 * fastest.delay, rtol=1e-7, atol=0)
        assert_allclose(within.spend_price, cheapest.spend_price, rtol=1e-3, atol=0)

    def test_without_any_room_keeps_the_smallest_sizes(self) -> None:
        question = inverters(4, 256.0)
        answer = solve(question, Budget(question.cost(question.lower)))
        assert_array_equal(answer.sizes, question.lower)
        assert answer.gap < 1e-6

    def test_of_sizes_that_cost_nothing_is_the_fastest(self) -> None:
        question = replace(inverters(4, 256.0), spend=np.zeros(4), spend_fixed=3.0)
        answer = solve(question, Budget(3.0))
        assert_allclose(answer.delay, 20.0, rtol=1e-9, atol=0)
        assert answer.spend_price == 0.0

    def test_refuses_less_than_the_smallest_sizes_cost(self) -> None:
        question = inverters(4, 256.0)
        with pytest.raises(BudgetTooSmallError, match=r"a spend of 0\.5 is out of reach") as caught:
            solve(question, Budget(0.5))
        assert caught.value.least == question.cost(question.lower)

    def test_refuses_less_than_the_limits_cost(self) -> None:
        # x1 >= 10 x0 by the limit, though x1 may be as small as 0.1 by its bounds.
        limit: list[list[Term]] = [[(10.0, 0, 1)]]
        arcs = [Arc(0, 1, [(1.0, 1, 0), (9.0, None, 1)])]
        question = problem(arcs, [1, 0.1], [20, 20], starts={0: 0.0}, ends={1: 0.0}, limits=limit)
        assert solve(question, Budget(12.0)).sizes[1] >= 10.0
        with pytest.raises(BudgetTooSmallError) as caught:
            solve(question, Budget(5.0))
        assert_allclose(caught.value.least, 11.0, rtol=1e-5, atol=0)


class TestLimits:
    def test_over_several_sizes_are_kept_and_priced(self) -> None:
        # Two equal sizes share a ceiling of 6; the envelope theorem gives its price.
        def question(ceiling: float) -> Problem:
            arcs = [Arc(0, k + 1, [(36.0, None, k)]) for k in range(2)]
            limit: list[list[Term]] = [[(1 / ceiling, 0, None), (1 / ceiling, 1, None)]]
            return problem(
                arcs, [1, 1], [99, 99], starts={0: 0.0}, ends={1: 0.0, 2: 0.0}, limits=limit
            )

        answer = solve(question(6.0), Fastest())
        assert_allclose(answer.sizes, [3, 3], rtol=1e-6, atol=0)
        assert_allclose(answer.limit_prices, [12.0], rtol=1e-6, atol=0)
        step = 1e-4
        wider = solve(question(6.0 * (1 + step)), Fastest()).delay
        assert_allclose((answer.delay - wider) / step, 12.0, rtol=1e-3, atol=0)

    def test_that_the_start_breaks_are_kept(self) -> None:
        question = random_problem(21, 20, depth=5)
        assert question.limit_sums(question.upper).max() > 1.0
        answer = solve(question, Fastest(), start=question.upper)
        assert question.limit_sums(answer.sizes).max() <= 1.0

    def test_below_what_the_smallest_sizes_give_name_their_row(self) -> None:
        question = random_problem(22, 20, depth=5)
        row = 2
        tight = np.where(question.limit.row == row, 10.0, 1.0) * question.limit.coefficient
        question = replace(question, limit=replace(question.limit, coefficient=tight))
        with pytest.raises(LimitOutOfReachError, match="limit 2 cannot be kept") as caught:
            solve(question, Fastest())
        assert caught.value.limit_row == row
        assert_allclose(caught.value.least, question.limit_sums(question.lower)[row], rtol=1e-9)

    @pytest.mark.parametrize("goal", [Fastest(), Cheapest(3.0), Budget(30.0)])
    def test_that_contradict_each_other_are_named(self, goal: Fastest | Cheapest | Budget) -> None:
        # x0 >= 2 x1 and x1 >= x0: each alone could be kept.
        limits: list[list[Term]] = [[(0.1, 0, None)], [(2.0, 1, 0)], [(1.0, 0, 1)]]
        arcs = [Arc(0, 1, [(1.0, 1, 0), (9.0, None, 1)])]
        question = problem(arcs, [1, 1], [20, 20], starts={0: 0.0}, ends={1: 0.0}, limits=limits)
        with pytest.raises(LimitOutOfReachError) as caught:
            solve(question, goal)
        assert caught.value.limit_row in {1, 2}
        assert_allclose(caught.value.least, np.sqrt(2.0), rtol=1e-5, atol=0)


class TestShape:
    def test_fixed_sizes_stay(self) -> None:
        question = inverters(4, 256.0)
        lower, upper = question.lower.copy(), question.upper.copy()
        lower[2] = upper[2] = 5.0
        answer = solve(replace(question, lower=lower, upper=upper), Fastest())
        assert answer.sizes[2] == 5.0
        # What is left is two chains whose stages have equal effort each.
        assert_allclose(answer.sizes[[1, 3]], [np.sqrt(5), np.sqrt(5 * 256)], rtol=1e-6, atol=0)

    @pytest.mark.parametrize("goal", [Fastest(), Cheapest(1000.0), Budget(99.0)])
    def test_nothing_free_is_timed_and_proven(self, goal: Fastest | Cheapest | Budget) -> None:
        question = inverters(3, 64.0)
        fixed = np.array([1.0, 2.0, 8.0])
        question = replace(question, lower=fixed, upper=fixed)
        answer = solve(question, goal)
        assert_array_equal(answer.sizes, fixed)
        assert_allclose(answer.delay, 3 + 2 + 4 + 8, rtol=1e-12, atol=0)
        assert check(question, goal, answer).gap < 1e-8
        assert_allclose(answer.flow, 1.0, rtol=1e-12, atol=0)

    def test_nodes_off_every_path_carry_no_flow(self) -> None:
        one: list[Term] = [(4.0, None, 0), (1.0, 0, None)]
        dead: list[Term] = [(1e6, None, 0)]
        question = problem(
            [Arc(0, 2, one), Arc(1, 2, dead), Arc(0, 3, dead), Arc(4, 5, dead)],
            [1],
            [9],
            starts={0: 0.0},
            ends={2: 0.0, 5: 0.0},
        )
        answer = solve(question, Fastest())
        assert_allclose(answer.sizes, [2.0], rtol=1e-6, atol=0)
        assert_allclose(answer.flow, [1.0, 0.0, 0.0, 0.0], rtol=0, atol=1e-12)
        assert_allclose(answer.end_flow, [1.0, 0.0], rtol=0, atol=1e-12)

    def test_start_that_is_an_end(self) -> None:
        question = problem(
            [Arc(0, 1, [(4.0, None, 0)])], [1], [9], starts={0: 2.0, 1: 0.0}, ends={0: 1.0}
        )
        assert solve(question, Fastest()).delay == 3.0

    def test_offsets_that_bring_the_worst_delay_to_zero(self) -> None:
        question = replace(inverters(4, 256.0), end_offset=np.array([-20.0]))
        answer = solve(question, Fastest())
        assert_allclose(answer.delay, 0.0, rtol=0, atol=1e-6)
        assert check(question, Fastest(), answer).gap < 1e-8

    def test_no_path_is_refused(self) -> None:
        question = replace(inverters(3, 8.0), start_node=np.array([3], dtype=np.int32))
        question = replace(question, end_node=np.array([0], dtype=np.int32))
        with pytest.raises(NoPathError):
            solve(question, Fastest())

    def test_many_copies_that_share_their_sizes(self) -> None:
        # 2000 rows of one driver and one gate: like a single one that drives all of them.
        rows = 2000
        arcs = [Arc(0, 1, [(float(rows), 1, 0), (1.0, None, None)])]
        for row in range(rows):
            arcs.append(Arc(1, 2 + row, [(1.0, 2, 1)]))
            arcs.append(Arc(2 + row, 2 + rows + row, [(400.0, None, 2)]))
        question = problem(
            arcs,
            [100.0, 1e-3, 1e-3],
            [100.0, 1e3, 1e3],
            starts={0: 0.0},
            ends={2 + rows + row: 0.0 for row in range(rows)},
        )
        answer = solve(question, Fastest())
        effort = (rows * 400.0 / 100.0) ** (1 / 3)
        assert_allclose(answer.delay, 1 + 3 * effort, rtol=1e-8, atol=0)
        assert check(question, Fastest(), answer).gap < 1e-7


def test_too_few_iterations_are_an_error_with_the_gap() -> None:
    with pytest.raises(NotConvergedError, match="came no closer than"):
        solve(random_problem(30, 30, depth=6), Fastest(), iterations=3)


def test_same_question_same_answer() -> None:
    question = random_problem(31, 30, depth=6)
    first, second = solve(question, Fastest()), solve(question, Fastest())
    assert_array_equal(first.sizes, second.sizes)
    assert_array_equal(first.flow, second.flow)
