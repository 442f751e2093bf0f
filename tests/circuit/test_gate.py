"""Networks recognised as static gates, or refused with a reason."""

from __future__ import annotations

import pytest

from evenstage.circuit.function import inverted_text
from evenstage.circuit.gate import GateForm, Unrecognised, recognise_network
from evenstage.circuit.network import HIGH, LOW, Switch

Y, A, B, C, M, Q, R, S = range(8)
NAMES = dict(zip(range(8), ["y", "a", "b", "c", "m", "q", "r", "s"], strict=True))


def n(a: int, gate: int, b: int) -> Switch:
    return Switch("n", a, gate, b)


def p(a: int, gate: int, b: int) -> Switch:
    return Switch("p", a, gate, b)


INVERTER = (n(Y, A, LOW), p(Y, A, HIGH))
NAND2 = (n(Y, A, M), n(M, B, LOW), p(Y, A, HIGH), p(Y, B, HIGH))
AOI21 = (n(Y, A, M), n(M, B, LOW), n(Y, C, LOW), p(Y, C, Q), p(Q, A, HIGH), p(Q, B, HIGH))
BRIDGE = (
    n(Y, A, M), n(M, B, LOW), n(Y, C, Q), n(Q, R, LOW), n(M, S, Q),
    p(Y, A, 8), p(8, C, HIGH), p(Y, B, 9), p(9, R, HIGH), p(8, S, 9),
)  # fmt: skip


def form(devices: tuple[Switch, ...]) -> GateForm:
    found = recognise_network(devices)
    assert isinstance(found, GateForm), found
    return found


class TestFunctions:
    @pytest.mark.parametrize(
        ("devices", "text"),
        [
            (INVERTER, "!a"),
            (NAND2, "!(a & b)"),
            (AOI21, "!(a & b | c)"),
            (
                (n(Y, A, M), n(Y, B, M), n(M, C, LOW), p(Y, C, HIGH), p(Y, A, Q), p(Q, B, HIGH)),
                "!((a | b) & c)",
            ),
        ],
    )
    def test_series_parallel(self, devices: tuple[Switch, ...], text: str) -> None:
        assert inverted_text(form(devices).pull_down, NAMES.__getitem__) == text

    def test_a_bridge_is_the_sum_of_its_paths(self) -> None:
        names = {**NAMES, R: "d", S: "e"}
        text = inverted_text(form(BRIDGE).pull_down, names.__getitem__)
        terms = {frozenset(term.split(" & ")) for term in text[2:-1].split(" | ")}
        assert terms == {
            frozenset("ab"), frozenset("cd"), frozenset("aed"), frozenset("ceb"),
        }  # fmt: skip


class TestArcs:
    def test_inverter_has_one_each_way(self) -> None:
        arcs = form(INVERTER).arcs
        assert [(arc.rising, len(arc.path)) for arc in arcs] == [(True, 1), (False, 1)]

    def test_the_input_next_to_the_supply_moves_the_inner_node(self) -> None:
        moved = {(a.input, a.rising): dict(a.moved) for a in form(NAND2).arcs}
        assert moved[A, False] == {Y: 2}
        assert moved[B, False] == {Y: 2, M: 1}
        assert moved[A, True] == {Y: 1}
        assert moved[B, True] == {Y: 1, M: 1}

    def test_a_side_network_hangs_where_it_is_tied(self) -> None:
        """With b low and a high, the inner node of the idle stack moves with the output."""
        moved = {(a.input, a.rising): dict(a.moved) for a in form(AOI21).arcs}
        assert moved[C, False] == {Y: 1, M: 1}

    def test_nodes_behind_a_switch_of_the_idle_pull_are_told_apart(self) -> None:
        """With a high the output rises by b, and drags the inner node along through a's n switch.

        Where c pulls the output low, the idle stack's node falls through n switches: in full.
        """
        behind = {(a.input, a.rising): dict(a.behind) for a in form(NAND2).arcs}
        assert behind == {(A, False): {}, (B, False): {}, (A, True): {}, (B, True): {M: 0}}
        assert all(not arc.behind for arc in form(AOI21).arcs if arc.input == C and not arc.rising)

    def test_a_node_two_switches_behind_counts_with_the_first(self) -> None:
        devices = (
            *(n(Y, A, M), n(M, B, Q), n(Q, C, LOW)),
            *(p(Y, A, HIGH), p(Y, B, HIGH), p(Y, C, HIGH)),
        )
        (last,) = (arc for arc in form(devices).arcs if arc.input == C and arc.rising)
        assert dict(last.behind) == {M: 0, Q: 0}

    def test_what_another_setting_outdoes_is_dropped(self) -> None:
        rising_c = [arc for arc in form(AOI21).arcs if arc.input == C and arc.rising]
        assert {arc.path for arc in rising_c} == {(3, 4), (3, 5)}


class TestRefusals:
    @pytest.mark.parametrize(
        ("devices", "reason"),
        [
            ((n(Y, A, M), n(M, B, LOW)), "no node is pulled both up and down"),
            (
                (n(Y, A, M), p(Y, B, M), n(M, C, LOW), p(M, C, HIGH)),
                "2 nodes are pulled both ways",
            ),
            ((n(Y, A, LOW), p(Y, B, HIGH)), "conduct together"),
            ((n(Y, A, LOW), p(Y, A, HIGH), n(Y, B, LOW)), "conduct together"),
            ((n(Y, A, M), n(M, B, LOW), p(Y, A, HIGH)), "neither pull conducts"),
            ((n(Y, Y, LOW), p(Y, A, HIGH)), "one of its own inputs"),
            ((n(Y, A, HIGH), p(Y, A, HIGH), n(Y, A, LOW)), "an n switch pulls up"),
            ((n(Y, HIGH, LOW), p(Y, HIGH, HIGH), p(Y, LOW, HIGH)), "no input moves its output"),
        ],
    )
    def test_reason_is_said(self, devices: tuple[Switch, ...], reason: str) -> None:
        found = recognise_network(devices)
        assert isinstance(found, Unrecognised)
        assert reason in found.reason

    def test_complementary_inputs_make_an_exclusive_or(self) -> None:
        """With b = !a and q = !c known, ``!(a c | b q)`` is complementary; without, it is not."""
        down = (n(Y, A, M), n(M, C, LOW), n(Y, B, S), n(S, Q, LOW))
        up = (p(Y, A, R), p(R, Q, HIGH), p(Y, B, 8), p(8, C, HIGH))
        assert isinstance(recognise_network(down + up), Unrecognised)
        assert isinstance(recognise_network(down + up, ((B, A), (Q, C))), GateForm)

    def test_too_many_inputs(self) -> None:
        wide = tuple(p(Y, 10 + k, HIGH) for k in range(13))
        nodes = [Y, *range(100, 112), LOW]
        stack = tuple(n(nodes[k], 10 + k, nodes[k + 1]) for k in range(13))
        found = recognise_network(wide + stack)
        assert isinstance(found, Unrecognised)
        assert "too many" in found.reason
