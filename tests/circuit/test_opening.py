"""Transmission gates that open one transistor after the other."""

from __future__ import annotations

import math

import numpy as np
import pytest

from evenstage.circuit.stage_tables import WEAK, stage_arcs
from support.blocks import block, circuit_of, inverter
from support.pass_networks import transmission_gate

#: Two drivers of 1 kohm selected by s and, made of it, b; plain widths.
SELECTOR = block(
    "\n".join([
        inverter("d", "d", "x", 1, 2), inverter("e", "e", "v", 1, 2),
        inverter("s", "s", "b", 1, 2),
        transmission_gate("t", "x", "w", "s", "b"), transmission_gate("u", "v", "w", "b", "s"),
        inverter("o", "w", "y", 1, 2), "cb b 0 11f",
    ]),
    "d e s y vdd vss",
)  # fmt: skip


def single_pole(early: float, late: float, second: float) -> float:
    """Return when a node gets half-way whose time constant falls from one to another.

    The Elmore delays hold ln 2. Heun's method in steps so fine that their error does not show.
    """
    step, time, voltage = early / 5000, 0.0, 0.0
    while voltage < 0.5:
        rate = math.log(2) / (early if time < second else late)
        ahead = voltage + step * rate * (1 - voltage)
        voltage += step * rate * (1 - (voltage + ahead) / 2)
        time += step
    return time


@pytest.mark.parametrize("second", [0.0, 0.4, 1.2, 2.0])
def test_the_law_is_that_of_a_pole_whose_resistance_falls(second: float) -> None:
    early, late = 2.0, 0.7
    found = single_pole(early, late, second)
    assert found == pytest.approx(late + second * (1 - late / early), rel=2e-3)
    assert single_pole(early, late, 3.0) == pytest.approx(early, rel=2e-3)


class TestSelector:
    def test_a_control_carries_a_share_of_the_inverter_that_makes_the_other(self) -> None:
        """With the shares worked out by hand, and b's 16 fF through 1 kohm either way."""
        circuit = circuit_of(SELECTOR)
        (stage,) = circuit.stages
        plain = stage_arcs(stage, circuit.electrical, circuit.drive)
        entry, output = circuit.net_id("s"), circuit.net_id("w")
        made = circuit.arcs.elmore(circuit.net_cap)
        alone = plain.elmore(circuit.net_cap)
        # n passes a high level through 2 kohm, p through 2 kohm, both through 1 kohm; a low one
        # through 1 kohm, 4 kohm, both through 0.8 kohm. The driver has 1 kohm, only w moves.
        # On b: gates of one n and one p, the capacitor, and 3 um of drains.
        inverting = 1e3 * (1e-15 + 1e-15 + 11e-15 + 3e-15)
        for input_rising, rising, over in (
            (True, True, WEAK), (True, False, 1.25), (False, True, 2.0), (False, False, 5.0),
        ):  # fmt: skip
            mine, theirs = (
                (arcs.input == entry)
                & (arcs.output == output)
                & (arcs.rising == rising)
                & (arcs.input_rising == input_rising)
                for arcs in (circuit.arcs, plain)
            )
            share = (over - 1) / (2 + over - 1)
            expected = alone[theirs].max() + share * inverting
            assert made[mine].max() == pytest.approx(expected, rel=1e-12)
            assert share > 0.1

    def test_nothing_begins_at_the_control_that_comes_second(self) -> None:
        circuit = circuit_of(SELECTOR)
        begins = circuit.arcs.input[circuit.arcs.output == circuit.net_id("w")]
        assert circuit.net_id("b") not in begins
        assert circuit.net_id("s") in begins

    def test_controls_that_come_from_outside_keep_their_arcs(self) -> None:
        cards = [
            inverter("d", "d", "x", 1, 2), transmission_gate("t", "x", "w", "s", "b"),
            inverter("o", "w", "y", 1, 2),
        ]  # fmt: skip
        circuit = circuit_of(block("\n".join(cards), "d s b y vdd vss"))
        arcs = circuit.arcs
        begins = set(arcs.input[arcs.output == circuit.net_id("w")].tolist())
        assert {circuit.net_id("s"), circuit.net_id("b")} <= begins

    def test_the_share_depends_on_no_width(self) -> None:
        """Else sizes would stand in it, and the sums were none of monomials."""
        circuit = circuit_of(SELECTOR)
        redrawn = circuit.resized(np.linspace(0.5, 3, len(circuit.devices)))
        found = []
        for one in (circuit, redrawn):
            (stage,) = one.stages
            plain = stage_arcs(stage, one.electrical, one.drive)
            late, alone = (
                arcs.elmore(one.net_cap)[
                    (arcs.input == one.net_id("s"))
                    & (arcs.output == one.net_id("w"))
                    & arcs.input_rising
                    & arcs.rising
                ].max()
                for arcs in (one.arcs, plain)
            )
            to_b = (one.arcs.output == one.net_id("b")) & one.arcs.input_rising
            found.append((late - alone) / one.arcs.elmore(one.net_cap)[to_b].max())
        assert found == pytest.approx([1 / 3, 1 / 3], rel=1e-9)

    def test_sums_stay_right_at_other_widths(self) -> None:
        """What a gate's size divides and multiplies is told apart: as the circuit redrawn."""
        circuit = circuit_of(SELECTOR)
        factor = np.array([1.0 + 0.5 * (k % 3) for k in range(len(circuit))])
        pins = circuit.pins
        load = circuit.fixed_cap + np.bincount(
            pins.net, pins.cap.today * factor[pins.gate], len(circuit.fixed_cap)
        )
        arcs, size = circuit.arcs, np.append(factor, 1.0)
        charges, own = arcs.charges, arcs.own
        found = np.bincount(
            charges.arc, charges.resistance / size[charges.owner] * load[charges.net], len(arcs)
        )
        through = own.today / size[own.resistance_owner] * size[own.capacitance_owner]
        found += np.bincount(own.arc, through, len(arcs))
        redrawn = circuit.resized(factor[circuit.gate_of_device])
        expected = redrawn.arcs.elmore(redrawn.net_cap)
        np.testing.assert_allclose(found, expected, rtol=1e-12, atol=0)
        assert not np.allclose(found, arcs.elmore(circuit.net_cap), rtol=0.05, atol=0)
