"""The checker must confirm what is right and find what is wrong."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.errors import NotConvergedError
from evenstage.sizing.certificate import check
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.interior_point import solve
from support.problems import chain_problem, random_problem

if TYPE_CHECKING:
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.solution import Solution

QUESTION = random_problem(50, 30, depth=6)
FASTEST = solve(QUESTION, Fastest())
CHEAPEST = solve(QUESTION, Cheapest(1.02 * FASTEST.delay))


def refusal(wrong: Solution, goal: Goal | None = None) -> str:
    with pytest.raises(NotConvergedError) as caught:
        check(QUESTION, goal or Fastest(), wrong)
    return caught.value.message


def test_confirms_what_the_optimiser_claims() -> None:
    found = check(QUESTION, Fastest(), FASTEST)
    assert_allclose(found.delay, FASTEST.delay, rtol=1e-12, atol=0)
    assert_allclose(found.spend, FASTEST.spend, rtol=1e-12, atol=0)
    assert_allclose(found.bound, FASTEST.bound, rtol=1e-10, atol=0)
    assert found.worst_limit <= 1.0
    assert found.conservation_error < 1e-13
    assert found.gap < 1e-8


def test_bound_of_equal_stages_by_hand() -> None:
    # sizes 1, 4 and load 16: each stage 4, no gradient, so the bound is the delay itself.
    question = chain_problem([1, 1], [1, 1], [1, 1], 1, 16)
    sizes = np.array([1.0, 4.0])
    answer = replace(
        solve(question, Fastest()),
        sizes=sizes,
        bound_sizes=sizes,
        arrivals=np.array([0.0, 5.0, 10.0]),
        delay=10.0,
        spend=5.0,
        bound=10.0,
    )
    found = check(question, Fastest(), replace(answer, gap=0.0))
    assert_allclose(found.bound, 10.0, rtol=1e-14, atol=0)


def test_refuses_a_bound_that_is_too_good() -> None:
    wrong = replace(FASTEST, bound=FASTEST.delay * (1 + 1e-7))
    assert refusal(wrong) == "not confirmed that the bound holds"


def test_refuses_a_gap_that_is_too_good() -> None:
    lazy = np.exp(np.log(FASTEST.sizes) + 0.01)
    lazy = np.clip(lazy, QUESTION.lower, QUESTION.upper)
    slow = replace(
        CHEAPEST, gap=0.0, bound=FASTEST.bound, limit_prices=FASTEST.limit_prices, spend_price=0.0
    )
    assert refusal(slow) in {
        "not confirmed that the bound holds",
        "not confirmed that the gap is as stated",
    }
    assert refusal(replace(FASTEST, sizes=lazy)).startswith("not confirmed that")


def test_refuses_flow_that_appears_from_nowhere() -> None:
    flow = FASTEST.flow.copy()
    inner = int(np.argmax(np.where(QUESTION.arc_source >= QUESTION.start_node.max() + 1, flow, 0)))
    flow[inner] *= 1 + 1e-6
    assert refusal(replace(FASTEST, flow=flow)) == "not confirmed that the flow is conserved"


def test_refuses_flow_that_is_not_a_unit() -> None:
    wrong = replace(FASTEST, flow=2 * FASTEST.flow, end_flow=2 * FASTEST.end_flow)
    assert refusal(wrong) == "not confirmed that the flow is conserved"


def test_refuses_negative_multipliers() -> None:
    prices = FASTEST.limit_prices - 1e-3
    wrong = replace(FASTEST, limit_prices=prices)
    assert refusal(wrong) == "not confirmed that multipliers are not negative"


def test_refuses_sizes_out_of_the_box() -> None:
    sizes = FASTEST.sizes.copy()
    sizes[0] = QUESTION.upper[0] * (1 + 1e-6)
    wrong = replace(FASTEST, sizes=sizes)
    assert refusal(wrong) == "not confirmed that sizes are inside their bounds"


def test_refuses_broken_limits() -> None:
    assert refusal(replace(FASTEST, sizes=QUESTION.upper)) == "not confirmed that limits are kept"


def test_refuses_a_wrong_delay() -> None:
    wrong = replace(FASTEST, delay=FASTEST.delay * (1 - 1e-6))
    assert refusal(wrong) == "not confirmed that the delay is as stated"


@pytest.mark.parametrize("node", ["start", "end"])
def test_refuses_arrivals_that_come_too_early(node: str) -> None:
    times = FASTEST.arrivals.copy()
    times[QUESTION.start_node[0] if node == "start" else QUESTION.end_node] -= 1e-6
    wrong = replace(FASTEST, arrivals=times, delay=FASTEST.delay - 1e-6 * (node == "end"))
    assert refusal(wrong) == "not confirmed that no arrival is too early"


def test_refuses_a_bound_measured_out_of_the_box() -> None:
    wrong = replace(FASTEST, bound_sizes=QUESTION.upper * 1.1)
    assert refusal(wrong) == "not confirmed that sizes are inside their bounds"


def test_refuses_a_wrong_spend() -> None:
    wrong = replace(FASTEST, spend=FASTEST.spend * (1 - 1e-6))
    assert refusal(wrong) == "not confirmed that the spend is as stated"


def test_refuses_a_missed_delay() -> None:
    assert (
        refusal(CHEAPEST, Cheapest(1.01 * FASTEST.delay))
        == "not confirmed that the delay is as asked"
    )


def test_refuses_an_overdrawn_budget() -> None:
    assert (
        refusal(FASTEST, Budget(FASTEST.spend - 1.0)) == "not confirmed that the spend is as asked"
    )
