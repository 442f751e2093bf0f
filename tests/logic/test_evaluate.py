"""Values of nets: whole circuits with known behaviour, and random ones against their gates."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings

from evenstage.errors import CircuitError, SettingsError
from evenstage.logic.settle import GIVEN, KEPT, STRONG, WEAK
from support.blocks import block, circuit_of, inverter, nand, network, transistor
from support.logic import all_vectors, function_values, values
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit

X = -1


def circuit(*cards: str, ports: str) -> Circuit:
    return circuit_of(block("\n".join(cards), ports))


def gate(name: str, a: str, on: str, off: str, b: str) -> str:
    """Return a transmission gate."""
    return network("n", name, [(a, on, b, 1)]) + "\n" + network("p", name, [(a, off, b, 2)])


LATCH = (
    inverter("c", "ck", "cb", 1, 2),
    gate("t", "d", "ck", "cb", "m"),
    inverter("q", "m", "q", 1, 2),
    inverter("f", "q", "k", 1, 2),
    gate("u", "k", "cb", "ck", "m"),
)


class TestCombinational:
    @settings(max_examples=40, deadline=None)
    @given(random_blocks())
    def test_nets_are_what_the_gates_make_of_them(self, drawn: RandomBlock) -> None:
        found = circuit_of(drawn.text())
        vectors = all_vectors(list(drawn.inputs))
        known = values(found, {found.net_id(n) or 0: v for n, v in vectors.items()})
        result = found.evaluate(vectors)
        for net, wanted in known.items():
            name = found.devices.net_names[net]
            assert result[name].tolist() == wanted.astype(int).tolist()
            if net in found.gate_output:
                assert (result.strength(name) == STRONG).all()

    def test_what_is_not_named_is_unknown(self) -> None:
        found = circuit(nand("g", ["a", "b"], "y", 2, 2), ports="a b y").evaluate({"a": [0, 1]})
        assert found["y"].tolist() == [1, X]
        assert found.strength("a").tolist() == [GIVEN, GIVEN]

    def test_an_n_pass_transistor_degrades_a_1(self) -> None:
        found = circuit(
            inverter("i", "a", "b", 1, 2),
            transistor("n", "b", "s", "k", 1, "p"),
            inverter("o", "k", "y", 1, 2),
            ports="a s y",
        ).evaluate({"a": [0, 1, 0], "s": [1, 1, 0]})
        assert found["k"].tolist() == [1, 0, X]
        assert found.strength("k").tolist() == [WEAK, STRONG, KEPT]

    @pytest.mark.parametrize(("width", "low"), [(0.6, 0), (1.1, X)])
    def test_a_load_gives_way_if_it_is_weak_enough(self, width: float, low: int) -> None:
        """The plain p channel has twice the resistance: widths 1 and 1 are just clear."""
        found = circuit(
            transistor("n", "y", "a", "vss", 1, "d"),
            transistor("p", "y", "vss", "vdd", width, "l"),
            ports="a y",
        ).evaluate({"a": [0, 1]})
        assert found["y"].tolist() == [1, low]
        assert found.strength("y").tolist() == [STRONG, WEAK]


class TestStorage:
    def test_a_latch_keeps_what_its_clock_let_in(self) -> None:
        found = circuit(*LATCH, ports="d ck q").evaluate(
            {"ck": [[0], [1], [0], [0], [1]], "d": [[1], [1], [1], [0], [0]]}
        )
        assert found["q"].ravel().tolist() == [X, 0, 0, 0, 1]

    def test_a_flip_flop_shows_what_was_there_before_the_edge(self) -> None:
        found = circuit(
            *LATCH,
            gate("s", "q", "cb", "ck", "n"),
            inverter("o", "n", "o", 1, 2),
            inverter("h", "o", "z", 1, 2),
            gate("v", "z", "ck", "cb", "n"),
            ports="d ck o",
        ).evaluate({"ck": [[1], [0], [0], [1], [0]], "d": [[1], [0], [0], [0], [1]]})
        assert found["o"].ravel().tolist() == [X, 1, 1, 1, 0]

    def test_vectors_of_a_sequence_do_not_see_each_other(self) -> None:
        found = circuit(*LATCH, ports="d ck q").evaluate(
            {"ck": [[1, 1], [0, 0]], "d": [[0, 1], [1, 0]]}
        )
        assert found["q"].tolist() == [[1, 0], [1, 0]]

    def test_a_memory_cell_is_written_by_the_bit_line_that_is_low(self) -> None:
        """And keeps its value when read: the access transistor is weaker than its pull-down."""
        cell = circuit(
            inverter("l", "q", "qb", 2, 0.5),
            inverter("r", "qb", "q", 2, 0.5),
            transistor("n", "bl", "wl", "q", 1, "a"),
            transistor("n", "bb", "wl", "qb", 1, "b"),
            inverter("d", "da", "bl", 8, 16),
            inverter("e", "db", "bb", 8, 16),
            ports="da db wl q",
        )
        found = cell.evaluate(
            {
                "da": [[0], [0], [0], [1], [1]],
                "db": [[1], [1], [0], [0], [1]],
                "wl": [[1], [0], [1], [1], [0]],
            }
        )
        assert found["q"].ravel().tolist() == [1, 1, 1, 0, 0]
        assert found["qb"].ravel().tolist() == [0, 0, 0, 1, 1]

    def test_a_domino_gate_keeps_its_charge_and_its_keeper_gives_way(self) -> None:
        cards = (
            network("n", "d", [("x", "a", "m", 2), ("m", "b", "f", 2), ("f", "ck", "vss", 2)]),
            transistor("p", "x", "ck", "vdd", 1, "pre"),
            inverter("i", "x", "y", 1, 4),
        )
        keeper = transistor("p", "x", "y", "vdd", 0.3, "kp")
        inputs = {
            "ck": [[0, 0], [1, 1], [0, 0], [1, 1]],
            "a": [[0, 0], [0, 1], [0, 0], [0, 0]],
            "b": [[0, 0], [0, 1], [0, 0], [0, 1]],
        }
        for some in (cards, (*cards, keeper)):
            found = circuit(*some, ports="ck a b y").evaluate(inputs)
            assert found["y"].tolist() == [[0, 0], [0, 1], [0, 0], [0, 0]]
            strength = [STRONG, STRONG if keeper in some else KEPT, STRONG]
            assert found.strength("x")[:3, 0].tolist() == strength

    def test_charge_is_shared_by_capacitance(self) -> None:
        """A node of 9 fF keeps its value over one of 1 fF; two equal ones are unknown."""
        for cap, wanted in ((0.001, 1), (9, X)):
            found = circuit(
                transistor("n", "x", "s", "m", 0.1, "s"),
                transistor("p", "x", "c", "vdd", 0.1, "c"),
                transistor("n", "m", "e", "vss", 0.1, "e"),
                inverter("y", "x", "y", 0.1, 0.2),
                "cx x vss 9f",
                f"cm m vss {cap}f",
                ports="s c e y",
            ).evaluate({"c": [[0], [1], [1]], "e": [[1], [0], [0]], "s": [[0], [0], [1]]})
            assert found["x"].ravel().tolist() == [1, 1, wanted]
            assert found["m"].ravel().tolist() == [0, 0, wanted]

    def test_a_ring_of_inverters_is_unknown_until_it_is_held(self) -> None:
        found = circuit(
            nand("g", ["en", "c"], "a", 2, 2),
            inverter("i", "a", "b", 1, 2),
            inverter("j", "b", "c", 1, 2),
            ports="en a",
        ).evaluate({"en": [[0], [1], [0]]})
        assert found["a"].ravel().tolist() == [1, X, 1]


class TestFunction:
    def test_is_written_as_a_sum_of_products(self) -> None:
        found = circuit(
            nand("g", ["a", "b"], "k", 2, 2),
            nand("h", ["k", "c"], "y", 2, 2),
            ports="a b c y",
        ).function("y")
        assert str(found) == "a & b | !c"
        assert found.inputs == ("a", "b", "c")
        assert found.undecided == "0"

    def test_of_a_latch_is_undecided_while_it_stores(self) -> None:
        found = circuit(*LATCH, ports="d ck q").function("q")
        assert (str(found), found.undecided) == ("!d & ck", "!ck")

    def test_of_a_multiplexer_of_transmission_gates(self) -> None:
        found = circuit(
            inverter("s", "s", "sb", 1, 2),
            gate("a", "a", "s", "sb", "k"),
            gate("b", "b", "sb", "s", "k"),
            inverter("o", "k", "y", 1, 2),
            ports="a b s y",
        ).function("y")
        known = all_vectors(list(found.inputs))
        wanted = function_values("!(a & s | b & !s)", known)
        assert found.table.tolist() == wanted.astype(int).tolist()
        assert function_values(str(found), known).tolist() == wanted.tolist()

    def test_of_many_inputs_is_refused(self) -> None:
        cards, last = [], "i0"
        for index in range(1, 18):
            cards.append(nand(f"g{index}", [last, f"i{index}"], f"n{index}", 2, 2))
            last = f"n{index}"
        ports = " ".join(f"i{index}" for index in range(18))
        with pytest.raises(CircuitError, match="'n17' depends on 18 inputs") as caught:
            circuit(*cards, ports=f"{ports} n17").function("n17")
        assert caught.value.code == "many-inputs"


class TestMistakes:
    @pytest.mark.parametrize(
        ("inputs", "code"),
        [
            ({"ab": [1]}, "unknown-net"),
            ({"a": [2]}, "input-values"),
            ({"a": [0.5]}, "input-values"),
            ({"a": [0, 1], "y": [0, 1, 1]}, "input-shapes"),
            ({"a": np.zeros((1, 1, 1), int)}, "input-shapes"),
            ({"vdd": [0]}, "supply-driven"),
        ],
    )
    def test_are_named(self, inputs: dict[str, list[int]], code: str) -> None:
        with pytest.raises(SettingsError) as caught:
            circuit(inverter("i", "a", "y", 1, 2), ports="a y").evaluate(inputs)
        assert caught.value.code == code
