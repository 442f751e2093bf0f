"""Logical effort and parasitic delay of gates, from netlists with those widths.

Published values: Sutherland, Sproull and Harris, *Logical Effort*, 1999, chapters 4 and 5, and
Weste and Harris, *CMOS VLSI Design*, 4th ed. 2011, chapter 4 (both from memory); every figure
recomputed by counting widths, ``g = width on the input / (1 + gamma)``, ``p = width on the output /
(1 + gamma)``.
"""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest

from evenstage.process.process import Junction, Junctions
from evenstage.timing.analyse import time
from evenstage.timing.yardstick import yardstick
from support.blocks import block, circuit_of, inverter, nand, network, nor, plain_process

GAMMAS = (1.0, 1.5, 2.0, 3.0)


def shared_diffusion(cards: str) -> str:
    """Give every drain its area and no source any: two devices in series share one diffusion."""
    return "\n".join(
        re.sub(r"w=([\d.]+)u", r"w=\1u ad=\1p as=0 pd=0 ps=0", card) for card in cards.split("\n")
    )


def efforts(cards: str, gamma: float = 2.0) -> dict[tuple[str, str], tuple[float, float]]:
    """Return (g, p) of the slowest arc by (input net, edge of the output) of a one-gate block."""
    process = plain_process(gamma)
    # 1 fF per square micron: a drain of its width in microns times one micron counts as that width.
    junction = Junction(area=1e-3, edge=0.0)
    types = tuple(
        replace(t, junctions=Junctions(rise=junction, fall=junction)) for t in process.transistors
    )
    process = replace(process, transistors=types)
    circuit = circuit_of(block(cards, "y vdd vss"), process)
    unit = yardstick(circuit.process)
    arcs, pins, names = circuit.arcs, circuit.pins, circuit.devices.net_names
    found: dict[tuple[str, str], tuple[float, float]] = {}
    for arc in range(len(arcs.gate)):
        cap = float(pins.cap.today[pins.net == arcs.input[arc]].sum())
        g = float(arcs.output_resistance[arc]) * cap / unit.tau
        p = float(arcs.own_today[arc]) / unit.tau
        key = (names[arcs.input[arc]], "rise" if arcs.rising[arc] else "fall")
        found[key] = max(found.get(key, (0.0, 0.0)), (g, p))
    return found


@pytest.mark.parametrize("gamma", GAMMAS)
class TestSymmetricGates:
    """Table rows G1 to G9 of the books, for any P/N ratio."""

    def test_inverter(self, gamma: float) -> None:
        for g, p in efforts(inverter("i", "a", "y", 1, gamma), gamma).values():
            assert g == pytest.approx(1, rel=1e-12)
            assert p == pytest.approx(1, rel=1e-12)

    @pytest.mark.parametrize("n", [2, 3, 4])
    def test_nand(self, gamma: float, n: int) -> None:
        inputs = list("abcd"[:n])
        found = efforts(nand("g", inputs, "y", n, gamma), gamma)
        for g, _ in found.values():
            assert g == pytest.approx((n + gamma) / (1 + gamma), rel=1e-12)
        # The input nearest to the output moves the output node alone.
        p = (n + n * gamma) / (1 + gamma)
        assert found["a", "fall"][1] == pytest.approx(p)
        assert found["a", "rise"][1] == pytest.approx(p)

    @pytest.mark.parametrize("n", [2, 3, 4])
    def test_nor(self, gamma: float, n: int) -> None:
        inputs = list("abcd"[:n])
        found = efforts(nor("g", inputs, "y", 1, n * gamma), gamma)
        for g, _ in found.values():
            assert g == pytest.approx((1 + n * gamma) / (1 + gamma), rel=1e-12)
        assert found["a", "fall"][1] == pytest.approx(n)

    def test_nand_and_nor_together(self, gamma: float) -> None:
        g_nand = efforts(nand("g", ["a", "b", "c"], "y", 3, gamma), gamma)["a", "rise"][0]
        g_nor = efforts(nor("g", ["a", "b", "c"], "y", 1, 3 * gamma), gamma)["a", "rise"][0]
        assert g_nand + g_nor == pytest.approx(4, rel=1e-12)

    @pytest.mark.parametrize("p_at_output", [True, False])
    def test_and_or_invert_21(self, gamma: float, *, p_at_output: bool) -> None:
        """``!(a & b | c)``; the parasitic delay depends on which p device touches the output."""
        down = [("y", "a", "m", 2.0), ("m", "b", "vss", 2.0), ("y", "c", "vss", 1.0)]
        up = [
            ("y", "c", "q", 2 * gamma),
            ("q", "a", "vdd", 2 * gamma),
            ("q", "b", "vdd", 2 * gamma),
        ]
        if not p_at_output:
            flip = {"y": "vdd", "vdd": "y"}
            up = [(flip.get(s, s), gate, flip.get(d, d), w) for s, gate, d, w in up]
        found = efforts(network("n", "g", down) + "\n" + network("p", "g", up), gamma)
        assert found["a", "fall"][0] == pytest.approx(2)
        assert found["b", "fall"][0] == pytest.approx(2)
        assert found["c", "fall"][0] == pytest.approx((1 + 2 * gamma) / (1 + gamma))
        on_output = (3 + (2 if p_at_output else 4) * gamma) / (1 + gamma)
        own = [p for (net, edge), (_, p) in found.items() if (net, edge) == ("a", "rise")]
        assert own[0] >= on_output * (1 - 1e-12)

    def test_or_and_invert_21(self, gamma: float) -> None:
        """``!((a | b) & c)``."""
        down = [("y", "c", "m", 2.0), ("m", "a", "vss", 2.0), ("m", "b", "vss", 2.0)]
        up = [("y", "a", "q", 2 * gamma), ("q", "b", "vdd", 2 * gamma), ("y", "c", "vdd", gamma)]
        found = efforts(network("n", "g", down) + "\n" + network("p", "g", up), gamma)
        assert found["a", "fall"][0] == pytest.approx(2)
        assert found["c", "fall"][0] == pytest.approx((2 + gamma) / (1 + gamma))

    def test_and_or_invert_22(self, gamma: float) -> None:
        down = [("y", "a", "m", 2.0), ("m", "b", "vss", 2.0)]
        down += [("y", "c", "k", 2.0), ("k", "d", "vss", 2.0)]
        up = [("y", "a", "q", 2 * gamma), ("y", "b", "q", 2 * gamma)]
        up += [("q", "c", "vdd", 2 * gamma), ("q", "d", "vdd", 2 * gamma)]
        found = efforts(network("n", "g", down) + "\n" + network("p", "g", up), gamma)
        assert [g for g, _ in found.values()] == pytest.approx([2] * 8, rel=1e-12)

    def test_majority_by_mirror(self, gamma: float) -> None:
        """G15: the asymmetric majority ``a (b + c) + b c``: a 2; b and c 4; p 4."""
        down = [("y", "a", "m", 2.0), ("m", "b", "vss", 2.0), ("m", "c", "vss", 2.0)]
        down += [("y", "b", "k", 2.0), ("k", "c", "vss", 2.0)]
        up = [
            ("y", "a", "q", 2 * gamma),
            ("q", "b", "vdd", 2 * gamma),
            ("q", "c", "vdd", 2 * gamma),
        ]
        up += [("y", "b", "r", 2 * gamma), ("r", "c", "vdd", 2 * gamma)]
        found = efforts(network("n", "g", down) + "\n" + network("p", "g", up), gamma)
        assert found["a", "fall"][0] == pytest.approx(2)
        assert found["b", "fall"][0] == pytest.approx(4)
        assert found["c", "rise"][0] == pytest.approx(4)


class TestPublishedFigures:
    """Figures as printed, for a P/N ratio of 2."""

    @pytest.mark.parametrize(
        ("cards", "g"),
        [
            (nand("g", ["a", "b"], "y", 2, 2), 4 / 3),
            (nand("g", ["a", "b", "c"], "y", 3, 2), 5 / 3),
            (nand("g", ["a", "b", "c", "d"], "y", 4, 2), 6 / 3),
            (nor("g", ["a", "b"], "y", 1, 4), 5 / 3),
            (nor("g", ["a", "b", "c"], "y", 1, 6), 7 / 3),
            (nor("g", ["a", "b", "c", "d"], "y", 1, 8), 9 / 3),
        ],
    )
    def test_textbook_gates(self, cards: str, g: float) -> None:
        assert efforts(cards)["a", "fall"][0] == pytest.approx(g, rel=1e-12)

    @pytest.mark.parametrize(
        ("n", "p"), [(1, 1.0), (2, 7 / 3), (3, 4.0), (4, 6.0), (5, 25 / 3), (6, 11.0)]
    )
    def test_falling_parasitic_of_nand_by_elmore(self, n: int, p: float) -> None:
        """PD1: ``(n^2 + 5 n)/6`` with contacted internal nodes, by the input next to the supply."""
        inputs = list("abcdef"[:n])
        found = efforts(shared_diffusion(nand("g", inputs, "y", n, 2)))
        assert found[inputs[-1], "fall"][1] == pytest.approx(p, rel=1e-12)

    def test_rising_parasitic_of_nand3_with_internal_nodes(self) -> None:
        """PD3: rising with internal nodes charged 15 RC, output alone 9 RC; one tau is 3 RC."""
        found = efforts(shared_diffusion(nand("g", ["a", "b", "c"], "y", 3, 2)))
        assert found["a", "rise"][1] == pytest.approx(9 / 3)
        assert found["c", "rise"][1] == pytest.approx(15 / 3)

    @pytest.mark.parametrize(
        ("s", "g_a", "g_b"), [(0.5, 4 / 3, 4 / 3), (0.25, 10 / 9, 2.0), (0.1, 1.0370370, 4.0)]
    )
    def test_asymmetric_nand2(self, s: float, g_a: float, g_b: float) -> None:
        """A2: fast input a drives 1/(1-s), slow input b 1/s."""
        found = efforts(nand("g", ["a", "b"], "y", [1 / (1 - s), 1 / s], 2))
        assert found["a", "fall"][0] == pytest.approx(g_a, rel=1e-6)
        assert found["b", "fall"][0] == pytest.approx(g_b, rel=1e-6)

    @pytest.mark.parametrize(
        ("cards", "rising", "falling"),
        [
            (inverter("i", "a", "y", 0.5, 2), 5 / 6, 5 / 3),
            (nand("g", ["a", "b"], "y", 1, 2), 1, 2),
            (nor("g", ["a", "b"], "y", 0.5, 4), 3 / 2, 3),
            (inverter("i", "a", "y", 1, 1), 4 / 3, 2 / 3),
            (nand("g", ["a", "b"], "y", 2, 1), 2, 1),
            (nor("g", ["a", "b"], "y", 1, 2), 2, 1),
        ],
    )
    def test_skewed_gates(self, cards: str, rising: float, falling: float) -> None:
        """A4 and A5: input capacitance over that of the unskewed inverter with the same drive."""
        found = efforts(cards)
        assert found["a", "rise"][0] == pytest.approx(rising, rel=1e-12)
        assert found["a", "fall"][0] == pytest.approx(falling, rel=1e-12)


def test_tau_and_fo4_of_the_plain_inverter() -> None:
    """U1, E1: with p_inv = 1 the fan-out-of-four inverter takes 5 tau."""
    unit = yardstick(circuit_of(block(inverter("i", "a", "y", 1, 2), "a y vdd vss")).process)
    assert unit.p_inv == pytest.approx(1)
    assert unit.fo4 == pytest.approx(5 * unit.tau)
    assert unit.tau == pytest.approx(1e-3 / 1e-6 * 3e-15)


def test_a_chain_of_fo4_inverters_takes_fo4_per_stage_with_slopes() -> None:
    """Transitions repeat in an endless chain: every stage but the first few takes exactly FO4."""
    widths = [4.0**k for k in range(12)]
    nets = [f"x{k}" for k in range(13)]
    cards = "\n".join(
        inverter(f"i{k}", nets[k], nets[k + 1], w, 2 * w) for k, w in enumerate(widths)
    )
    process = plain_process(slope=0.21, slope_power=0.7, shape=1.7, shape_carry=0.3)
    cards += f"\ncl x12 vss {3 * 4.0**12}f"
    circuit = circuit_of(block(cards, "x0 x12 vdd vss"), process)
    timing = time(circuit)
    delays = timing.delay[timing.winner[timing.graph.end]]
    np.testing.assert_allclose(delays, timing.unit.fo4, rtol=1e-9, atol=0)


def third(value: float) -> float:
    """Return a published figure that counts widths over the three of the unit inverter."""
    return value / 3


class TestRatioedGates:
    """Pseudo-nMOS: the load has a third of the unit drive, the network four thirds.

    So the network, less the load, drives as the unit inverter does (Sutherland, Sproull and Harris,
    section 10.1, from memory; recomputed). Of one input, in the order of the edges fall and rise.
    """

    @pytest.mark.parametrize(
        ("cards", "fall", "rise"),
        [
            ([("y", "a", "vss", 4 / 3)], 4 / 9, 4 / 3),
            ([("y", "a", "vss", 4 / 3), ("y", "b", "vss", 4 / 3)], 4 / 9, 4 / 3),
            ([("y", "a", "m", 8 / 3), ("m", "b", "vss", 8 / 3)], 8 / 9, 8 / 3),
        ],
        ids=["inverter", "nor2", "nand2"],
    )
    def test_efforts(
        self, cards: list[tuple[str, str, str, float]], fall: float, rise: float
    ) -> None:
        load = network("p", "l", [("y", "vss", "vdd", 2 / 3)])
        found = efforts(network("n", "d", cards) + "\n" + load)
        assert found["a", "fall"][0] == pytest.approx(fall)
        assert found["a", "rise"][0] == pytest.approx(rise)


class TestDynamicGates:
    """Dynamic gates with a precharge transistor of width 1 (the same, section 8.1, from memory).

    The output goes to a buffer, as in domino logic. Recomputed: ``g`` the input width that gives
    unit drive, ``p`` the drains on the output, both over the three of the unit inverter.
    """

    @pytest.mark.parametrize(
        ("stack", "g", "p"),
        [
            ([("x", "a", "vss", 1)], third(1), third(2)),
            ([("x", "a", "m", 2), ("m", "b", "vss", 2)], third(2), third(3)),
            ([("x", "a", "vss", 1), ("x", "b", "vss", 1)], third(1), third(3)),
            ([("x", "a", "m", 2), ("m", "ck", "vss", 2)], third(2), third(3)),
            (
                [("x", "a", "m", 3), ("m", "b", "k", 3), ("k", "ck", "vss", 3)],
                third(3), third(4),
            ),
            (
                [("x", "a", "m", 2), ("x", "b", "m", 2), ("m", "ck", "vss", 2)],
                third(2), third(5),
            ),
        ],
        ids=["inverter", "nand2", "nor2", "footed inverter", "footed nand2", "footed nor2"],
    )  # fmt: skip
    def test_efforts(self, stack: list[tuple[str, str, str, float]], g: float, p: float) -> None:
        cards = [
            shared_diffusion(network("n", "d", stack)),
            network("p", "l", [("x", "ck", "vdd", 1)]),
            inverter("i", "x", "y", 1, 4),
        ]
        found = efforts("\n".join(cards))
        assert found["a", "fall"] == pytest.approx((g, p))
        assert ("a", "rise") not in found
