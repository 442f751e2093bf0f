"""Parameters of subcircuits and their callers, and multipliers."""

from __future__ import annotations

import pytest

from evenstage.errors import ElaborationError
from support.laid_out import INVERTER, block, microns


class TestParameters:
    def test_defaults_use_their_siblings(self) -> None:
        assert microns(block(INVERTER)) == [1, 2]

    def test_a_caller_overrides_a_default_and_siblings_follow(self) -> None:
        text = ".subckt top a b v g\nx1 a b v g inv wn=3u\nx2 a b v g inv wp=5u\n.ends"
        assert microns(block(INVERTER + text)) == [3, 6, 1, 5]

    def test_a_value_is_worked_out_where_the_caller_stands(self) -> None:
        text = """.param wn=7u
.subckt top a b v g wn=4u
x1 a b v g inv wn='wn/2'
.ends"""
        assert microns(block(INVERTER + text)) == [2, 4]

    def test_globals_are_seen_inside_and_masked_by_the_subcircuits_own(self) -> None:
        text = """.param k=2 w0=1u
.subckt t d g s b k=3
.param w1='k*w0'
m1 d g s b nch w=w1 l=0.1u
m2 d g s b nch w='k*w0' l=0.1u
m3 d g s b nch w={w0} l=0.1u
.ends"""
        assert microns(block(text)) == [3, 3, 1]

    def test_a_default_that_names_itself_takes_the_global(self) -> None:
        text = ".param w=3u\n.subckt t d g s b w=w\nm1 d g s b nch w=w l=0.1u\n.ends"
        assert microns(block(text)) == [3]

    def test_a_later_assignment_counts(self) -> None:
        assert microns(block(".param w=1u\nm1 a b c 0 nch w=w l=1u\n.param w=2u")) == [2]

    def test_params_keyword_and_order_of_definition_do_not_matter(self) -> None:
        inner = ".subckt inv2 a y v g params: wn=1u\nmn y a g g nch w=wn l=1u\n.ends"
        text = f"x1 a b v g inv2 params: wn=2u\n{inner}"
        assert microns(block(text)) == [2]

    def test_a_chain_of_five_hundred_parameters(self) -> None:
        chain = "\n".join(f".param p{i}='p{i - 1}+0.01u'" for i in range(1, 500))
        text = f".param p0=1u\n{chain}\nm1 a b c 0 nch w=p499 l=1u"
        assert microns(block(text)) == [5.99]


class TestMultipliers:
    def test_of_card_and_of_all_enclosing_instances(self) -> None:
        text = """.param two=2
.subckt leaf a y v g
m1 y a g g nch w=1u l=0.1u m='two+1'
c1 y g 1f m=2
.ends
.subckt mid a y v g
x1 a y v g leaf m=5
.ends
x1 a y v 0 mid m=two
x2 a y v 0 mid"""
        devices = block(text)
        assert devices.multiplier.tolist() == [30, 15]
        assert devices.capacitance.tolist() == pytest.approx([20e-15, 10e-15], rel=1e-12)

    def test_m_that_the_subcircuit_declares_and_uses_is_its_own_affair(self) -> None:
        text = ".subckt t d g s b m=1\nm1 d g s b nch w='m*1u' l=1u\n.ends\nx1 a b c 0 t m=4"
        devices = block(text)
        assert (microns(devices), devices.multiplier.tolist()) == ([4], [1])

    def test_m_that_the_subcircuit_declares_but_ignores_multiplies(self) -> None:
        text = ".subckt t d g s b m=1\nm1 d g s b nch w=1u l=1u\n.ends\nx1 a b c 0 t m=4"
        assert block(text).multiplier.tolist() == [4]

    def test_mult_beside_m(self) -> None:
        assert block("m1 a b c 0 nch w=1u l=1u m=3 mult=1").multiplier.tolist() == [3]


def test_a_parameter_that_does_not_converge_is_the_callers_error() -> None:
    with pytest.raises(ElaborationError) as caught:
        block(INVERTER + "x1 a b c d inv wn='1u/0'")
    assert caught.value.code == "bad-expression"
    assert caught.value.span is not None
    assert caught.value.span.text == "'1u/0'"
