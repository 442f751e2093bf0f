"""Stacks of the same inputs in another order conduct together and share the current."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from support.blocks import block, circuit_of, inverter, plain_process, transistor

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit

_WIDTH = st.floats(0.5, 4.0)
_LEFT, _RIGHT = ("a", "b", "c"), ("c", "a", "b")


def stack(name: str, inputs: tuple[str, ...], widths: tuple[float, ...], y: str = "y") -> str:
    """Return the cards of one stack from an output to ground."""
    nets = [y, *(f"{name}{place}" for place in range(1, len(inputs))), "vss"]
    return "\n".join(
        transistor("n", nets[place], gate, nets[place + 1], width, f"{name}{place}")
        for place, (gate, width) in enumerate(zip(inputs, widths, strict=True))
    )


def pull_up(inputs: tuple[str, ...], y: str = "y") -> str:
    return "\n".join(transistor("p", y, gate, "vdd", 2, f"p{gate}") for gate in inputs)


def falling(circuit: Circuit, pin: str) -> tuple[float, float]:
    """Return output resistance and own delay of the one falling arc of an input."""
    arcs = circuit.arcs
    net = circuit.net_id(pin)
    (which,) = np.flatnonzero((arcs.input == net) & ~arcs.rising)
    return float(arcs.output_resistance[which]), float(arcs.own_today[which])


def area_by_solve(left: tuple[float, ...], right: tuple[float, ...], pin: str) -> float:
    """Return the area under the falling output, s, by solving the network of both stacks.

    Widths in um; a switch of width w is 1000/w ohm, an end w fF. Nodes that the other switches tie
    to ground before the edge hold no charge.
    """
    place = {("y", 0): 0}
    conductance, capacitance, held = np.zeros((5, 5)), np.zeros(5), np.zeros(5, bool)
    for name, inputs, widths in (("l", _LEFT, left), ("r", _RIGHT, right)):
        ends = [("y", 0), (name, 1), (name, 2), None]
        index = [None if end is None else place.setdefault(end, len(place)) for end in ends]
        for position, width in enumerate(widths):
            for here, other in (
                index[position : position + 2],
                index[position : position + 2][::-1],
            ):
                if here is not None:
                    capacitance[here] += width * 1e-15
                    conductance[here, here] += width / 1e3
                    if other is not None:
                        conductance[here, other] -= width / 1e3
        for position in range(inputs.index(pin) + 1, 3):
            held[index[position]] = True
    capacitance[0] += 3 * 2e-15
    charge = np.where(held, 0.0, capacitance)
    return float(np.linalg.solve(conductance, charge)[0])


class TestGate:
    @given(left=st.tuples(_WIDTH, _WIDTH, _WIDTH), right=st.tuples(_WIDTH, _WIDTH, _WIDTH))
    @pytest.mark.parametrize("pin", _LEFT)
    def test_its_delay_is_the_area_under_the_whole_network(
        self, pin: str, left: tuple[float, ...], right: tuple[float, ...]
    ) -> None:
        cards = [stack("l", _LEFT, left), stack("r", _RIGHT, right), pull_up(_LEFT)]
        circuit = circuit_of(block("\n".join(cards), "a b c y"))
        resistance, own = falling(circuit, pin)
        alone = [sum(1e3 / width for width in some) for some in (left, right)]
        assert_allclose(resistance, 1 / sum(1 / r for r in alone), rtol=1e-10, atol=0)
        assert_allclose(own, area_by_solve(left, right, pin), rtol=1e-10, atol=0)

    def test_two_equal_stacks_drive_as_one_twice_as_wide(self) -> None:
        cards = [stack("l", ("a", "b"), (1, 1)), stack("r", ("b", "a"), (1, 1))]
        twice = [stack("l", ("a", "b"), (2, 2))]
        constants = plain_process(r_fixed=50.0, stack=0.7)
        both, one = (
            falling(
                circuit_of(block("\n".join([*some, pull_up(("a", "b"))]), "a b y"), constants), "a"
            )[0]
            for some in (cards, twice)
        )
        # The constant part of a device is halved with the second stack; wider devices keep it.
        assert_allclose(both, one - 50.0 * (1 + 0.7) / 2, rtol=1e-10, atol=0)

    def test_paths_that_only_may_conduct_together_count_alone(self) -> None:
        """Of a majority no two paths are of the same inputs."""
        pairs = (("a", "b"), ("b", "c"), ("c", "a"))
        down = [stack(f"n{place}", pair, (1, 1)) for place, pair in enumerate(pairs)]
        up = [
            "\n".join(
                [
                    transistor("p", "y", pair[0], f"q{place}", 2, f"u{place}"),
                    transistor("p", f"q{place}", pair[1], "vdd", 2, f"v{place}"),
                ]
            )
            for place, pair in enumerate(pairs)
        ]
        circuit = circuit_of(block("\n".join([*down, *up]), "a b c y"))
        arcs = circuit.arcs
        assert_allclose(arcs.output_resistance[~arcs.rising], 2e3, rtol=1e-10, atol=0)


class TestDriverOfPasses:
    def test_stacks_before_a_transmission_gate_share_the_current_too(self) -> None:
        """A mirrored NAND2 of width 1 drives through a pass as a plain one of width 2 does."""
        gate = [
            transistor("n", "z", "s", "y", 1, "tn"),
            transistor("p", "z", "sn", "y", 1, "tp"),
            inverter("i", "s", "sn", 1, 2),
            pull_up(("a", "b")),
        ]
        mirrored = [stack("l", ("a", "b"), (1, 1)), stack("r", ("b", "a"), (1, 1))]
        plain = [stack("l", ("a", "b"), (2, 2))]
        found = []
        for down in (mirrored, plain):
            circuit = circuit_of(block("\n".join([*gate, *down]), "a b s z"))
            arcs = circuit.arcs
            which = (arcs.input == circuit.net_id("a")) & (arcs.output == circuit.net_id("z"))
            found.append(
                sorted(set(arcs.output_resistance[which & ~arcs.rising].round(6).tolist()))
            )
        assert found[0] == found[1]
