"""Drains and sources two by two around one strip of diffusion."""

from __future__ import annotations

import pytest
from numpy.testing import assert_allclose

from evenstage.circuit.sharing import shared_ends
from evenstage.process.process import Junction, Junctions
from support.blocks import circuit_of, plain_process

STRIP = """
.subckt nand2 y a b vdd vss
mna y a x vss nx w=1u l=0.1u
mnb x b vss vss nx w=1u l=0.1u
mpa y a vdd vdd px w=1u l=0.1u
mpb y b vdd vdd px w=1u l=0.1u
.ends
"""

THREE = """
.subckt inv3 y a vdd vss
mn1 y a vss vss nx w=1u l=0.1u
mn2 vss a y vss nx w=1u l=0.1u
mn3 y a vss vss nx w=1u l=0.1u
mp1 y a vdd vdd px w=1u l=0.1u m=2
.ends
"""

CALLED = """
.subckt inv y a vdd vss
mn y a vss vss nx w=1u l=0.1u
mp y a vdd vdd px w=1u l=0.1u
.ends
.subckt two y a b vdd vss
x1 y a vdd vss inv
x2 y b vdd vss inv
.ends
"""


class TestSharedEnds:
    def test_a_nand(self) -> None:
        """Its p drains share a strip, its n drain stands alone, its stack has a bare strip."""
        drain, source = shared_ends(circuit_of(STRIP).devices)
        assert drain.part.tolist() == [0, 1, 1, 1]
        assert drain.is_inner.tolist() == [False, True, False, False]
        assert source.is_inner.tolist() == [True, False, False, False]

    def test_of_three_ends_one_is_alone(self) -> None:
        drain, source = shared_ends(circuit_of(THREE).devices)
        assert_allclose([drain.part[0], source.part[1], drain.part[2]], 2 / 3, rtol=1e-15, atol=0)
        assert drain.part[3] == 1, "two copies stand side by side"

    def test_cells_do_not_share_with_each_other(self) -> None:
        drain, _ = shared_ends(circuit_of(CALLED).devices)
        assert drain.part.tolist() == [0, 0, 0, 0]

    def test_what_a_port_or_a_gate_meets_has_a_contact(self) -> None:
        with_port = STRIP.replace("nand2 y a b", "nand2 y a b x")
        with_gate = STRIP.replace(
            ".ends", "mnk k x vss vss nx w=1u l=0.1u\nmpk k x vdd vdd px w=1u l=0.1u\n.ends"
        )
        for text in (with_port, with_gate):
            drain, _ = shared_ends(circuit_of(text).devices)
            assert drain.part[1] == 1
            assert not drain.is_inner[1]


class TestCapacitance:
    @pytest.mark.parametrize(("shared", "inner"), [(0.5, 0.25), (0.8, 1.0)])
    def test_each_end_counts_by_its_strip(self, shared: float, inner: float) -> None:
        plain = circuit_of(STRIP, plain_process()).electrical
        values = circuit_of(STRIP, plain_process(drain_shared=shared, drain_inner=inner)).electrical
        assert_allclose(
            values.drain.today / plain.drain.today, [1, inner, shared, shared], rtol=1e-14
        )
        assert_allclose(values.source.today[0] / plain.source.today[0], inner, rtol=1e-14, atol=0)

    def test_areas_on_a_card_say_it_better(self) -> None:
        with_areas = STRIP.replace("l=0.1u", "l=0.1u ad=0.3p as=0.3p pd=2.6u ps=2.6u")
        one = Junction(area=1e-3, edge=1e-10)
        junctions = Junctions(rise=one, fall=one)
        values, plain = (
            circuit_of(
                with_areas,
                plain_process(junctions=junctions, drain_shared=counted, drain_inner=counted),
            ).electrical
            for counted in (0.5, 1.0)
        )
        assert_allclose(values.drain.today, plain.drain.today, rtol=0, atol=0)
