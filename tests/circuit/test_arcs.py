"""Arcs in columns: several charges and terms each, in any order."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from evenstage.circuit.arcs import NO_OWNER, Bundle, joined, ranges


def bundle(gates: list[int], charges: int, terms: int, seed: int) -> Bundle:
    random, k = np.random.default_rng(seed), len(gates)
    constants = random.uniform(0.1, 1, (4, k))
    return Bundle(
        gate=np.array(gates, np.int32),
        input=random.integers(0, 5, k, np.int32),
        output=random.integers(0, 5, k, np.int32),
        rising=bool(seed % 2),
        input_rising=bool(seed % 3),
        charge_net=random.integers(0, 5, (k, charges), np.int32),
        charge_owner=random.integers(-1, 4, (k, charges), np.int32),
        charge_resistance=random.uniform(1, 2, (k, charges)),
        own_resistance=random.uniform(1, 2, (k, terms)),
        own_resistance_owner=random.integers(-1, 4, (k, terms), np.int32),
        own_capacitance=random.uniform(1, 2, (k, terms)),
        own_capacitance_owner=random.integers(-1, 4, (k, terms), np.int32),
        slope=constants[0],
        slope_power=constants[1],
        shape=constants[2],
        shape_carry=constants[3],
    )


BUNDLES = st.lists(
    st.builds(
        bundle,
        st.lists(st.integers(0, 3), min_size=1, max_size=4),
        st.integers(1, 3),
        st.integers(0, 3),
        st.integers(1, 1000),
    ),
    min_size=1,
    max_size=4,
)


class TestJoined:
    @given(BUNDLES)
    def test_each_arc_keeps_its_sum(self, bundles: list[Bundle]) -> None:
        arcs, cap = joined(bundles), np.linspace(1, 2, 5)
        rows = [(int(b.gate[k]), b, k) for b in bundles for k in range(len(b.gate))]
        rows.sort(key=lambda row: row[0])
        assert arcs.gate.tolist() == [gate for gate, _, _ in rows]
        expected = [
            sum(r * cap[n] for r, n in zip(b.charge_resistance[k], b.charge_net[k], strict=True))
            + sum(b.own_resistance[k] * b.own_capacitance[k])
            for _, b, k in rows
        ]
        assert arcs.elmore(cap) == pytest.approx(expected, rel=1e-12)
        beside = arcs.elmore(np.stack([cap, 2 * cap], axis=1))
        assert beside[:, 0] == pytest.approx(expected, rel=1e-12)
        assert beside[:, 1] == pytest.approx(arcs.elmore(2 * cap), rel=1e-12)
        assert arcs.rising.tolist() == [b.rising for _, b, _ in rows]
        assert arcs.slope.tolist() == [b.slope[k] for _, b, k in rows]

    @given(BUNDLES)
    def test_gates_along_are_those_of_the_charges(self, bundles: list[Bundle]) -> None:
        arcs = joined(bundles)
        last = len(arcs) - 1
        owners = arcs.charges.owner[arcs.charges.arc == last].tolist()
        along = arcs.gates_along(np.array([last], np.int32)).tolist()
        assert along == [owner for owner in owners if owner != NO_OWNER]

    @given(BUNDLES)
    def test_output_resistance_counts_the_charges_of_the_output_alone(
        self, bundles: list[Bundle]
    ) -> None:
        arcs = joined(bundles)
        step = np.zeros(5)
        for net in range(5):
            step[:] = np.arange(5) == net
            rise = arcs.elmore(step) - arcs.elmore(0 * step)
            there = arcs.output == net
            assert arcs.output_resistance[there] == pytest.approx(rise[there], rel=1e-9)


def test_ranges_are_put_one_after_the_other() -> None:
    assert ranges(np.array([5, 0, 2]), np.array([2, 0, 3])).tolist() == [5, 6, 2, 3, 4]
