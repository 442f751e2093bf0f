"""Which cards share one size."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from hypothesis import given, settings

from evenstage.brief import Brief
from evenstage.pattern import Pattern
from evenstage.sizing.partition import partition
from support.blocks import circuit_of, inverter
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.sizing.partition import Partition

INV = ".subckt inv a y\n" + inverter("", "a", "y", 1, 2) + "\n.ends\n"
PAIR = (
    ".subckt pair a y\n" + inverter("i", "a", "m", 1, 2) + "\n" + inverter("j", "m", "y", 2, 4)
    + "\n.ends\n"
)  # fmt: skip


def circuit(definitions: str, calls: list[str], ports: str) -> Circuit:
    cards = "\n".join(calls)
    return circuit_of(f"* t\n.global vdd vss\n{definitions}.subckt top {ports}\n{cards}\n.ends\n")


def together(block: Circuit, parts: Partition) -> set[frozenset[str]]:
    """Return which gates share a size, by name."""
    names = np.array([block.gate_name(gate) for gate in range(len(block))])
    of_gate = parts.of_gate[:, 0]
    return {frozenset(names[of_gate == size].tolist()) for size in np.unique(of_gate)}


def pats(*names: str) -> tuple[Pattern, ...]:
    return tuple(Pattern(name) for name in names)


ROW = f"{INV}.subckt row a y\nx1 a m inv\nx2 m y inv\n.ends\n"
ROWS = circuit(ROW, [f"xr{k} a{k} y{k} row" for k in range(3)], "a0 a1 a2 y0 y1 y2")
CALLS = circuit(INV, ["x1 a b inv", "x2 b c inv", "x3 c y inv"], "a y")


class TestPartition:
    def test_each_call_of_a_leaf_has_its_own_size(self) -> None:
        parts = partition(CALLS)
        assert together(CALLS, parts) == {frozenset({"x1"}), frozenset({"x2"}), frozenset({"x3"})}
        assert all(slot.caller is not None for slot in parts.slots)

    def test_a_row_that_is_called_often_keeps_one_set_of_sizes(self) -> None:
        assert together(ROWS, partition(ROWS)) == {
            frozenset({"xr0.x1", "xr1.x1", "xr2.x1"}),
            frozenset({"xr0.x2", "xr1.x2", "xr2.x2"}),
        }

    def test_a_gate_beside_another_has_the_size_of_its_own_cards(self) -> None:
        block = circuit(PAIR, ["x1 a b pair", "x2 b y pair"], "a y")
        parts = partition(block)
        assert together(block, parts) == {
            frozenset({"x1.min", "x2.min"}),
            frozenset({"x1.mjn", "x2.mjn"}),
        }
        assert all(slot.caller is None for slot in parts.slots)

    def test_a_leaf_the_brief_names_is_sized_whole(self) -> None:
        block = circuit(PAIR, ["x1 a b pair", "x2 b y pair"], "a y")
        assert together(block, partition(block, Brief(leaves=pats("pair")))) == {
            frozenset({"x1.min", "x1.mjn"}),
            frozenset({"x2.min", "x2.mjn"}),
        }

    def test_of_leaves_in_leaves_the_outermost_counts(self) -> None:
        parts = partition(ROWS, Brief(leaves=pats("row")))
        assert together(ROWS, parts) == {frozenset({f"xr{k}.x1", f"xr{k}.x2"}) for k in range(3)}

    def test_a_card_in_two_gates_joins_them(self) -> None:
        """A half that serves two gates of its subcircuit: their sizes are one."""
        half = ".subckt half a b y z\nxu a y up\nxd a y down\nxv b z up\nxe b z down\n.ends\n"
        half += ".subckt up a y\nmp y a vdd vdd px w=2u l=0.1u\n.ends\n"
        half += ".subckt down a y\nmn y a vss vss nx w=1u l=0.1u\n.ends\n"
        block = circuit(half, ["xh a b y z half"], "a b y z")
        assert len(partition(block)) == 1

    def test_same_size(self) -> None:
        brief = Brief(same_size=(pats("x1", "x3.mn"),))
        assert together(CALLS, partition(CALLS, brief)) == {
            frozenset({"x1", "x3"}),
            frozenset({"x2"}),
        }

    def test_without_copies_the_calls_of_a_leaf_share_one_size(self) -> None:
        assert len(partition(CALLS, Brief(copies_per_leaf=0))) == 1

    def test_sizes_come_in_the_order_of_the_text(self) -> None:
        parts = partition(CALLS)
        assert parts.handle.tolist() == sorted(parts.handle.tolist())
        names = [CALLS.devices.netlist.card_name(card) for card in parts.handle.tolist()]
        assert names == ["x1", "x2", "x3"]

    @given(random_blocks())
    @settings(max_examples=30, deadline=None)
    def test_slots_cover_the_gates_and_agree_with_their_sizes(self, drawn: RandomBlock) -> None:
        block = circuit_of(drawn.text())
        parts = partition(block)
        inside = block.gate_of_device >= 0
        assert ((parts.slot_of_device >= 0) == inside).all()
        assert (parts.of_device[inside] == parts.of_gate[block.gate_of_device[inside], 0]).all()
        assert (parts.of_slot[parts.slot_of_device[inside]] == parts.of_device[inside]).all()
        assert (parts.slot_of_device[parts.first_device] == np.arange(len(parts.slots))).all()
        assert list(parts.variable_of.values()) == parts.of_slot.tolist()

    def test_transistors_outside_gates_have_no_size(self) -> None:
        block = circuit(INV, ["x1 a y inv", "mk d y e vss nx w=1u l=0.1u"], "a d e")
        parts = partition(block)
        assert parts.of_device.tolist() == [-1, 0, 0]
        assert parts.slot_of_device.tolist() == [-1, 0, 1]


class TestTied:
    def test_sizes_of_one_label_become_one(self) -> None:
        parts = partition(CALLS)
        tied = parts.tied(np.array([0, 1, 0], np.int32))
        assert together(CALLS, tied) == {frozenset({"x1", "x3"}), frozenset({"x2"})}
        assert tied.slots == parts.slots
        assert tied.handle.tolist() == parts.handle[:2].tolist()
        assert tied.variable_of == dict(
            zip(parts.slots, [[0, 1, 0][size] for size in parts.of_slot.tolist()], strict=True)
        )

    def test_what_has_no_size_gets_none(self) -> None:
        block = circuit(INV, ["x1 a y inv", "mk d y e vss nx w=1u l=0.1u"], "a d e")
        assert partition(block).tied(np.zeros(1, np.int32)).of_device.tolist() == [-1, 0, 0]
