"""Precharge: apart from the paths, from its clock's edge, against the phase of the brief."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from evenstage.brief import Brief, ClockBrief, InputBrief
from evenstage.errors import SettingsError
from evenstage.pattern import Pattern
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, network, transistor

if TYPE_CHECKING:
    from evenstage.timing.results import Precharge

DOMINO = "\n".join([
    network("n", "d", [("x", "a", "m", 2), ("m", "ck", "vss", 2)]),
    transistor("p", "x", "ck", "vdd", 1, "pre"), inverter("i", "x", "y", 1, 4),
])  # fmt: skip
UNFOOTED = "\n".join([
    DOMINO, transistor("n", "z", "y", "vss", 2, "e"), transistor("p", "z", "ck", "vdd", 1, "pz"),
    inverter("o", "z", "q", 1, 4),
])  # fmt: skip


def found(cards: str, ports: str, brief: Brief | None = None) -> dict[str, Precharge]:
    analysis = analyse(circuit_of(block(cards, ports), None, brief), brief)
    return {one.net: one for one in analysis.precharges}


def brief_of(low: float) -> Brief:
    return Brief(clocks=(ClockBrief(nets=(Pattern("ck"),), low=low),))


class TestPrecharges:
    def test_a_footed_gate_by_its_clock_alone(self) -> None:
        """2 kohm of a micron of p charge 5 fF of the buffer, 3 of the node and 4 behind a."""
        one = found(DOMINO, "a ck y")["x"]
        assert (one.edge, one.clock, one.clock_edge, one.devices) == (
            "rise",
            "ck",
            "fall",
            ("mpre",),
        )
        assert one.delay == pytest.approx(2e3 * 12e-15)
        assert one.complete == one.delay + one.transition / 2
        assert one.phase is None

    def test_without_a_foot_the_input_must_let_go_first(self) -> None:
        """A domino gate behind another: its node, then its buffer, then the next node."""
        both = found(UNFOOTED, "a ck q")
        fall = 1e3 * (2 + 5) * 1e-15
        assert both["z"].delay == pytest.approx(
            2e3 * (12 - 5 + 5) * 1e-15 + fall + 2e3 * (5 + 3) * 1e-15
        )
        assert both["z"].clock == "ck"

    def test_its_clock_may_come_through_gates(self) -> None:
        cards = DOMINO.replace(" ck ", " k ") + "\n" + inverter("c", "ckb", "k", 1, 2)
        one = found(cards, "a ckb y")["x"]
        assert (one.clock, one.clock_edge) == ("ckb", "rise")
        # The inverter of 1 kohm: 3 fF of its own, 2 of the foot and 1 of the precharge.
        assert one.delay == pytest.approx(1e3 * 6e-15 + 2e3 * 12e-15)

    def test_it_counts_from_the_clock_not_from_zero(self) -> None:
        late = Brief(inputs=(InputBrief(nets=(Pattern("ck"),), arrival=1e-9),))
        assert found(DOMINO, "a ck y", late)["x"].delay == pytest.approx(2e3 * 12e-15)

    def test_the_mirror_image_falls(self) -> None:
        cards = "\n".join([
            network("p", "u", [("x", "a", "m", 4), ("m", "ckb", "vdd", 4)]),
            transistor("n", "x", "ckb", "vss", 1, "pre"), inverter("i", "x", "y", 1, 4),
        ])  # fmt: skip
        one = found(cards, "a ckb y")["x"]
        assert (one.edge, one.clock_edge) == ("fall", "rise")

    def test_a_phase_that_is_too_short_is_noticed(self) -> None:
        for low, codes in ((1e-9, set()), (1e-11, {"precharge-late"})):
            brief = brief_of(low)
            analysis = analyse(circuit_of(block(DOMINO, "a ck y"), None, brief), brief)
            assert analysis.precharges[0].phase == low
            assert {n.code for n in analysis.notices} & {"precharge-late"} == codes

    def test_a_clock_nobody_knows_is_refused(self) -> None:
        with pytest.raises(SettingsError, match="no net fits 'clock'"):
            found(DOMINO, "a ck y", Brief(clocks=(ClockBrief(nets=(Pattern("clock"),)),)))

    def test_no_path_leads_through_it(self) -> None:
        analysis = analyse(circuit_of(block(DOMINO, "a ck y")), count=9)
        assert {path.edge for path in analysis.paths} == {"rise"}

    def test_static_blocks_have_none(self) -> None:
        assert found(inverter("i", "a", "y", 1, 2), "a y") == {}
