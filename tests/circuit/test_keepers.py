"""Keepers of nets that several drivers share or passes drive: what they hold, and how strongly."""

from __future__ import annotations

import pytest

from evenstage.circuit.strength import KEEPER_RATIO, stage_ratios
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, transistor
from support.pass_networks import transmission_gate, tri_state

HOLD = [inverter("k1", "w", "k", 0.5, 0.5), inverter("k2", "k", "w", 0.2, 0.2)]
ONE = [inverter("e0", "e0", "f0", 1, 2), tri_state("u0", "d0", "e0", "f0", "w")]
OTHER = [inverter("e1", "e1", "f1", 1, 2), tri_state("u1", "d1", "e1", "f1", "w")]
LISTENER = inverter("o", "w", "y", 1, 2)


def restored(width: float) -> str:
    """Return two pass transistors into a net whose high level a p transistor restores."""
    return block("\n".join([
        inverter("s", "s", "sb", 1, 2), inverter("i", "c", "a", 1, 2),
        inverter("j", "d", "b", 1, 2), transistor("n", "a", "s", "x", 1, "p1"),
        transistor("n", "b", "sb", "x", 1, "p2"), transistor("p", "x", "y", "vdd", width, "k"),
        inverter("o", "x", "y", 1, 2),
    ]), "c d s y")  # fmt: skip


class TestBuses:
    def test_a_keeper_on_a_bus_of_two_drivers_is_no_latch(self) -> None:
        text = block("\n".join([*ONE, *OTHER, *HOLD, LISTENER]), "d0 e0 d1 e1 y")
        found = circuit_of(text)
        assert [one.kind for one in found.storage.elements] == ["bus keeper"]
        starts = {path.start for path in analyse(found, count=99).paths if path.end == "y"}
        assert starts == {"d0", "e0", "d1", "e1"}

    def test_nor_is_one_on_a_bus_that_leaves_the_block(self) -> None:
        found = circuit_of(block("\n".join([*ONE, *HOLD]), "d0 e0 w"))
        assert [one.kind for one in found.storage.elements] == ["bus keeper"]

    def test_one_driver_inside_the_block_makes_a_latch(self) -> None:
        found = circuit_of(block("\n".join([*ONE, *HOLD, LISTENER]), "d0 e0 y"))
        assert [one.kind for one in found.storage.elements] == ["latch"]

    def test_so_does_a_gate_that_drives_more_than_the_keeper(self) -> None:
        """A latch of two ports: its inverted value leaves it."""
        leaving = inverter("o", "k", "y", 1, 2)
        found = circuit_of(block("\n".join([*ONE, *OTHER, *HOLD, leaving]), "d0 e0 d1 e1 y"))
        assert [one.kind for one in found.storage.elements] == ["latch"]


class TestOneLevel:
    def test_a_restorer_of_a_wide_multiplexer_makes_no_latch(self) -> None:
        """With no select high the net floats; the restorer could only hold it high."""
        cards = [inverter("o", "w", "y", 1, 2), transistor("p", "w", "y", "vdd", 0.2, "k")]
        for k in range(4):
            cards.append(inverter(f"d{k}", f"d{k}", f"x{k}", 1, 2))
            cards.append(transistor("n", f"x{k}", f"s{k}", "w", 1, f"p{k}"))
        found = circuit_of(block("\n".join(cards), "d0 d1 d2 d3 s0 s1 s2 s3 y"))
        assert found.storage.elements == ()
        assert {path.end for path in analyse(found, count=99).paths} == {"y"}

    def test_behind_one_clocked_gate_it_is_a_dynamic_latch(self) -> None:
        cards = [
            inverter("c", "ck", "ckb", 1, 2), inverter("d", "d", "db", 1, 2),
            transmission_gate("t", "db", "w", "ck", "ckb"), inverter("o", "w", "y", 1, 2),
            transistor("p", "w", "y", "vdd", 0.2, "k"),
        ]  # fmt: skip
        found = circuit_of(block("\n".join(cards), "d ck y"))
        assert [one.kind for one in found.storage.elements] == ["dynamic latch"]


class TestStrength:
    @pytest.mark.parametrize("width", [0.2, 1.0])
    def test_ratio_against_the_route_through_passes(self, width: float) -> None:
        """The keeper has 2 kohm/um; an n pass of 1 um and an inverter's n of 1 um 2 kohm."""
        found = circuit_of(restored(width))
        (stage,) = (some for some in found.stages if some.form.weak)
        (weak,) = stage.form.weak
        assert stage_ratios(found, stage, weak) == pytest.approx(2e3 / width / 2e3)
        told = [notice for notice in found.notices if notice.code == "strong-keeper"]
        assert len(told) == (1 / width < KEEPER_RATIO)
        for notice in told:
            assert notice.names == ("x",)
            assert "is 1 times that of the route against it, at least 2" in notice.message

    def test_a_keeper_that_nothing_drives_against_is_not_poor(self) -> None:
        found = circuit_of(restored(0.2))
        assert "strong-keeper" not in {notice.code for notice in found.notices}
