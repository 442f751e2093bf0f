"""Ways in bits against comparing resistances and charge everywhere: the values must be the same."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.logic.evaluate import evaluate
from evenstage.logic.order import batches
from evenstage.logic.planes import bits, table
from evenstage.logic.settle import settle
from evenstage.logic.switches import UNKNOWN, Switches, Values

NETS = 12
INPUTS = (2, 3, 4, 5)
#: Vectors fill two words and a part of a third.
VECTORS = 130


@st.composite
def networks(draw: st.DrawFn) -> Switches:
    """Return switches between any nets, closed by any; nets 0 and 1 are the supplies."""
    count = draw(st.integers(1, 14))

    def nets(least: int) -> np.ndarray:
        return np.array(
            draw(st.lists(st.integers(least, NETS - 1), min_size=count, max_size=count))
        )

    kinds = draw(st.lists(st.booleans(), min_size=count, max_size=count))
    ohm = draw(st.lists(st.sampled_from([1.0, 1.5, 3.0, 8.0]), min_size=count, max_size=count))
    cap = draw(st.lists(st.sampled_from([0.0, 1.0, 2.0, 7.0]), min_size=NETS, max_size=NETS))
    supply = np.full(NETS, UNKNOWN, np.int8)
    supply[:2] = 0, 1
    drain, gate, source = nets(6), nets(2), nets(0)
    names = [""] * NETS
    return Switches(
        drain, gate, source, np.array(kinds), np.array(ohm), np.array(cap), supply, names
    )


def compared(switches: Switches, inputs: dict[int, Values]) -> Values:
    """Return the values of all nets, every group settled by resistances and charge."""
    is_given = switches.supply != UNKNOWN
    is_given[list(inputs)] = True
    now = np.repeat(switches.supply[:, None], VECTORS, axis=1)
    found = []
    for step in range(2):
        for net, wanted in inputs.items():
            now[net] = wanted[step]
        for batch in batches(switches, is_given):
            own, rounds = batch.nets[: batch.free], 0
            waiting = np.ones(VECTORS, bool)
            while waiting.any():
                new = settle(switches, batch, now)
                if rounds >= 2 * batch.groups + 8:
                    new = np.where(new == now[own], new, UNKNOWN)
                changed = (new != now[own]) & waiting
                now[own] = np.where(changed, new, now[own])
                waiting = changed.any(axis=0) & batch.loops
                rounds += 1
        found.append(now.copy())
    return np.stack(found, axis=1)


@settings(max_examples=60, deadline=None)
@given(networks(), st.integers(0, 2**32 - 1))
def test_values_are_those_of_comparing_everywhere(switches: Switches, seed: int) -> None:
    random = np.random.default_rng(seed)
    inputs = {net: random.integers(-1, 2, (2, VECTORS)).astype(np.int8) for net in INPUTS}
    np.testing.assert_array_equal(evaluate(switches, inputs).values, compared(switches, inputs))


@given(st.lists(st.booleans(), min_size=1, max_size=200))
def test_words_are_their_table(values: list[bool]) -> None:
    assert table(bits(np.array([values])), len(values)).tolist() == [values]
