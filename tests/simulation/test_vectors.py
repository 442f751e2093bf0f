"""Side inputs are held as the path's vector says, and what happens where there is none."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from evenstage.circuit.evaluation import evaluate_circuit
from evenstage.errors import SimulationError
from evenstage.flow import Question
from evenstage.flow.loading import load
from evenstage.process.process import Channel
from evenstage.simulation.simulate import simulate
from evenstage.timing.analyse import analyse
from evenstage.timing.vectors import with_vectors
from support.blocks import block, circuit_of, inverter, nand, plain_process
from support.pass_networks import transmission_gate

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.timing.results import Analysis

CARRY = Path(__file__).parents[2] / "sample_netlists" / "carry_chain"


def circuit(cards: list[str], ports: str) -> Circuit:
    plain = plain_process(p_inv=0.7, slope=0.2, shape=1.8)
    kinds = tuple(
        replace(kind, channel=Channel(threshold=0.25, alpha=1.3)) for kind in plain.transistors
    )
    return circuit_of(block("\n".join(cards), ports), replace(plain, transistors=kinds))


def mux(name: str, data: tuple[str, str], select: str, output: str) -> list[str]:
    """Return a two-way multiplexer of NANDs with an inverter of its own."""
    return [
        inverter(f"{name}i", select, f"{name}n", 1, 2),
        nand(f"{name}a", [data[0], f"{name}n"], f"{name}p", 2, 2),
        nand(f"{name}b", [data[1], select], f"{name}q", 2, 2),
        nand(f"{name}c", [f"{name}p", f"{name}q"], output, 2, 2),
    ]


#: From a through both multiplexers is the longest way, and needs s at 0 and at 1.
FALSE = [
    *mux("m", ("a3", "b"), "s", "x"), inverter("i", "a", "a2", 1, 2),
    inverter("j", "a2", "a3", 1, 2), *mux("o", ("c", "x"), "s", "y"), "cy y 0 20f",
]  # fmt: skip


@pytest.fixture(scope="module")
def carry() -> Analysis:
    question = Question(process=CARRY / "process.toml", brief=CARRY / "brief.toml", count=1)
    return with_vectors(load(CARRY / "netlist.sp", question).analysis)


class TestVector:
    def test_holds_the_side_inputs(self, carry: Analysis) -> None:
        path = carry.paths[0]
        assert path.vector is not None
        assert carry.timing is not None
        found = simulate(carry).before.paths[0]
        assert found.by_vector
        inputs = {name: [int(value)] * 2 for name, value in path.vector.held}
        inputs[path.start] = [int(path.start_edge != "rise"), int(path.start_edge == "rise")]
        # Two vectors: a carry chain stores nothing.
        worth = evaluate_circuit(carry.timing.circuit, inputs)
        told = [(name, level) for name, level in found.held if worth[name][0] == worth[name][1]]
        assert len(told) > 8
        assert all(worth[name][0] in (int(level), -1) for name, level in told)
        assert sum(worth[name][0] == int(level) for name, level in told) > len(told) / 2

    def test_is_the_same_before_and_after(self, carry: Analysis) -> None:
        assert carry.timing is not None
        wider = replace(carry, paths=(replace(carry.paths[0], vector=None),))
        found = simulate(carry, wider)
        assert found.after is not None
        assert found.after.paths[0].held == found.before.paths[0].held
        assert found.after.paths[0].by_vector


class TestAnotherDesign:
    def test_is_told(self) -> None:
        one, other = (
            analyse(circuit([inverter("i", start, "y", 1, 2), "cy y 0 5f"], f"{start} y"))
            for start in ("a", "b")
        )
        (notice,) = [n for n in simulate(one, other).notices if n.code == "no-same-path"]
        assert notice.message.startswith("the slowest path before, from a to y, is not in ")


class TestNoVector:
    def test_a_false_path_is_not_simulated(self) -> None:
        analysis = analyse(circuit(FALSE, "a b c s y"), start="a", end="y")
        with pytest.raises(SimulationError, match="from a to y switch, whatever the delays") as e:
            simulate(analysis)
        assert e.value.code == "false-path"

    def test_the_next_one_is_and_those_before_told(self) -> None:
        analysis = with_vectors(analyse(circuit(FALSE, "a b c s y"), count=4))
        found = simulate(analysis)
        assert [path.start for path in analysis.false_paths] == ["a", "s"]
        first = found.before.paths[0]
        assert first.by_vector
        assert dict(first.held)["b"]
        codes = [notice.code for notice in found.notices]
        assert codes.count("false-path") == 1
        # Two more could switch only together with others: their gates need s at 0 and at 1.
        assert codes.count("cannot-switch") == 2

    def test_own_values_are_told(self) -> None:
        cards = [nand("g", ["a", "b"], "p", 2, 2), inverter("i", "p", "y", 1, 2), "cy y 0 5f"]
        found = simulate(analyse(circuit(cards, "a b y"), start="a"), conflicts=0)
        assert found.before.paths[0].held == (("b", True),)
        assert not found.before.paths[0].by_vector
        (notice,) = [one for one in found.notices if one.code == "own-side-inputs"]
        assert notice.message.endswith("which occur together: nobody looked for one")

    def test_a_path_alone_in_its_gates_says_nothing(self) -> None:
        chain = circuit([inverter("i", "a", "x", 1, 2), inverter("j", "x", "y", 1, 2)], "a y")
        found = simulate(analyse(chain), conflicts=0)
        assert "own-side-inputs" not in {notice.code for notice in found.notices}


class TestManyInputs:
    def test_a_selector_of_sixteen(self) -> None:
        cards = [inverter("o", "w", "y", 2, 4), "cy y 0 5f"]
        for i in range(16):
            cards.append(inverter(f"d{i}", f"d{i}", f"x{i}", 1, 2))
            cards.append(inverter(f"s{i}", f"s{i}", f"b{i}", 1, 2))
            cards.append(transmission_gate(f"t{i}", f"x{i}", "w", f"s{i}", f"b{i}"))
        ports = " ".join(f"d{i} s{i}" for i in range(16))
        found = simulate(analyse(circuit(cards, f"{ports} y"), start="d13", end="y"))
        held = dict(found.before.paths[0].held)
        assert [name for name, level in held.items() if name[0] == "s" and level] == ["s13"]
        assert all(held[f"b{i}"] != held[f"s{i}"] for i in range(16))
        assert found.before.paths[0].by_vector


class TestRatioed:
    def test_a_pull_up_that_never_lets_go(self) -> None:
        cards = [
            inverter("i", "a", "x", 1, 2), "mp n vss vdd vdd px w=0.5u l=0.1u",
            "m1 n x vss vss nx w=3u l=0.1u", "m2 n b vss vss nx w=3u l=0.1u",
            inverter("o", "n", "y", 1, 2), "cy y 0 5f",
        ]  # fmt: skip
        path = simulate(analyse(circuit(cards, "a b y"), start="a")).before.paths[0]
        assert dict(path.held) == {"b": False}
        assert len(path.stages) == 3
