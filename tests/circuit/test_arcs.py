"""Arcs in columns: several charges and terms each, in any order."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from evenstage.circuit.arcs import NO_OWNER, Arcs, Charges, OwnTerms, joined, ranges


def table(gates: list[int], charges: int, terms: int, seed: int) -> Arcs:
    random, k = np.random.default_rng(seed), len(gates)
    nets, owners = np.arange(5, dtype=np.int32), np.arange(-1, 4, dtype=np.int32)
    heads = [np.arange(k + 1, dtype=np.int32) * count for count in (charges, terms)]
    charged = Charges(
        heads[0],
        random.choice(nets, k * charges),
        random.choice(owners, k * charges),
        random.uniform(1, 2, k * charges),
    )
    of_terms = [random.uniform(1, 2, k * terms), random.choice(owners, k * terms)]
    own = OwnTerms(heads[1], *of_terms, *of_terms)
    constants = random.uniform(0.1, 1, (4, k))
    return Arcs(
        gate=np.array(gates, np.int32),
        input=random.choice(nets, k),
        output=random.choice(nets, k),
        rising=np.full(k, bool(seed % 2)),
        input_rising=np.full(k, bool(seed % 3)),
        charges=charged,
        own=own,
        slope=constants[0],
        slope_power=constants[1],
        shape=constants[2],
        shape_carry=constants[3],
    )


TABLES = st.lists(
    st.builds(
        table,
        st.lists(st.integers(0, 3), min_size=1, max_size=4),
        st.integers(1, 3),
        st.integers(1, 3),
        st.integers(1, 1000),
    ),
    min_size=1,
    max_size=4,
)


class TestJoined:
    @given(TABLES)
    def test_each_arc_keeps_its_sum(self, tables: list[Arcs]) -> None:
        arcs, cap = joined(tables), np.linspace(1, 2, 5)
        rows = [(int(t.gate[k]), t, k) for t in tables for k in range(len(t))]
        rows.sort(key=lambda row: row[0])
        assert arcs.gate.tolist() == [gate for gate, _, _ in rows]
        expected = []
        for _, part, k in rows:
            charge = range(part.charges.head[k], part.charges.head[k + 1])
            term = range(part.own.head[k], part.own.head[k + 1])
            total = sum(part.charges.resistance[i] * cap[part.charges.net[i]] for i in charge)
            total += sum(part.own.resistance[i] * part.own.capacitance[i] for i in term)
            expected.append(total)
        assert arcs.elmore(cap) == pytest.approx(expected, rel=1e-12)
        beside = arcs.elmore(np.stack([cap, 2 * cap], axis=1))
        assert beside[:, 0] == pytest.approx(expected, rel=1e-12)
        assert beside[:, 1] == pytest.approx(arcs.elmore(2 * cap), rel=1e-12)
        assert arcs.rising.tolist() == [bool(t.rising[k]) for _, t, k in rows]
        assert arcs.slope.tolist() == [t.slope[k] for _, t, k in rows]

    @given(TABLES)
    def test_gates_along_are_those_of_the_charges(self, tables: list[Arcs]) -> None:
        arcs = joined(tables)
        last = len(arcs) - 1
        owners = arcs.charges.owner[arcs.charges.arc == last].tolist()
        along = arcs.gates_along(np.array([last], np.int32)).tolist()
        assert along == [owner for owner in owners if owner != NO_OWNER]

    @given(TABLES)
    def test_output_resistance_counts_the_charges_of_the_output_alone(
        self, tables: list[Arcs]
    ) -> None:
        arcs = joined(tables)
        step = np.zeros(5)
        for net in range(5):
            step[:] = np.arange(5) == net
            rise = arcs.elmore(step) - arcs.elmore(0 * step)
            there = arcs.output == net
            assert arcs.output_resistance[there] == pytest.approx(rise[there], rel=1e-9)


def test_ranges_are_put_one_after_the_other() -> None:
    assert ranges(np.array([5, 0, 2]), np.array([2, 0, 3])).tolist() == [5, 6, 2, 3, 4]
