"""Patterns against the names of transistors, each name put together."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.brief import Brief, LimitBrief
from evenstage.errors import SettingsError
from evenstage.pattern import Pattern
from evenstage.sizing.named import (
    devices_named,
    gates_named,
    leaves_named,
    refuse_unknown_names,
)
from support.blocks import circuit_of

TEXT = """* rows of drivers, and one gate of its own
.global vdd vss
.subckt inv a y
mn y a vss vss nx w=1u l=0.1u
mp y a vdd vdd px w=2u l=0.1u
.ends
.subckt row a y
xi a m inv
m.n1 y m vss vss nx w=1u l=0.1u
m.p1 y m vdd vdd px w=2u l=0.1u
.ends
.subckt top a b y z
xrow1 a y row
xrow2 b z row
xi a q inv
mtopn r q vss vss nx w=1u l=0.1u
mtopp r q vdd vdd px w=2u l=0.1u
.ends
"""
CIRCUIT = circuit_of(TEXT)
DEVICES = CIRCUIT.devices
NAMES = [
    DEVICES.card_path(card, instance)
    for card, instance in zip(DEVICES.card.tolist(), DEVICES.instance.tolist(), strict=True)
]


def named(*patterns: str) -> set[str]:
    found = devices_named(DEVICES, [Pattern(text) for text in patterns])
    return {name for name, is_named in zip(NAMES, found.tolist(), strict=True) if is_named}


def expected(pattern: str) -> set[str]:
    """Names that fit as a whole, or whose path fits up to one of its instances."""
    fits = Pattern(pattern).fits
    instances = [DEVICES.instance_path(i) for i in range(1, len(DEVICES.instance_parent))]
    around = [path + "." for path in instances if fits(path)]
    return {name for name in NAMES if fits(name) or any(name.startswith(a) for a in around)}


class TestDevicesNamed:
    def test_by_card(self) -> None:
        assert named("xrow1.xi.mn") == {"xrow1.xi.mn"}
        assert named("XROW2.M.N1") == {"xrow2.m.n1"}

    def test_by_an_instance_around(self) -> None:
        assert named("xrow1") == {n for n in NAMES if n.startswith("xrow1.")}

    def test_a_card_of_the_block_itself(self) -> None:
        assert named("mtop?") == {"mtopn", "mtopp"}

    def test_several_patterns_add_up(self) -> None:
        assert named("mtopn", "xi") == {"mtopn", "xi.mn", "xi.mp"}

    def test_none_names_nothing(self) -> None:
        assert named() == set()

    @given(st.lists(st.sampled_from([*"xmrowtpin.12", ".", "*", "?", "xrow", "xi"]), max_size=6))
    @settings(max_examples=200, deadline=None)
    def test_as_if_every_name_were_put_together(self, parts: list[str]) -> None:
        pattern = "".join(parts)
        if not expected(pattern):
            with pytest.raises(SettingsError, match="no card fits"):
                named(pattern)
        else:
            assert named(pattern) == expected(pattern)

    def test_a_stranger_is_told_its_likes(self) -> None:
        with pytest.raises(SettingsError, match=r"the nearest are xrow1\.xi\.mp"):
            named("xrow1.xi.mm")


def test_gates_named_are_those_of_the_transistors() -> None:
    gates = gates_named(CIRCUIT, [Pattern("xrow?.xi.mn")])
    assert [CIRCUIT.gate_name(gate) for gate in gates] == ["xrow1.xi", "xrow2.xi"]
    assert gates_named(CIRCUIT, []) == []


class TestNamesOfABrief:
    @pytest.mark.parametrize(
        "brief",
        [
            Brief(fixed=(Pattern("nowhere"),)),
            Brief(same_size=((Pattern("xrow1"), Pattern("nowhere")),)),
            Brief(limits=(LimitBrief(cards=(Pattern("nowhere"),), width_max=1e-6),)),
            Brief(leaves=(Pattern("nowhere"),)),
        ],
    )
    def test_that_fit_nothing_are_refused(self, brief: Brief) -> None:
        with pytest.raises(SettingsError, match="fits 'nowhere'"):
            refuse_unknown_names(CIRCUIT, brief)

    def test_a_copy_goes_by_the_name_of_its_leaf(self) -> None:
        copied = (
            TEXT.replace(
                ".subckt row",
                "* evenstage: inv -> inv_s1: called by xi\n.subckt inv_s1 a y\n"
                "mn y a vss vss nx w=2u l=0.1u\nmp y a vdd vdd px w=4u l=0.1u\n.ends\n.subckt row",
            )
            .replace("m inv\n", "m inv_s1\n")
            .replace("q inv\n", "q inv_s1\n")
        )
        devices = circuit_of(copied).devices
        named = leaves_named(devices, [Pattern("inv")])
        assert [devices.subcircuits[index] for index in named] == ["inv_s1"]
