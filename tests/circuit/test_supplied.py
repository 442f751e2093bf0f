"""Which supplies gates hang on, in invented blocks with two pairs of them."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from evenstage.circuit.inventory import Entry, take_inventory
from evenstage.circuit.supplied import Domain, are_several, gate_domains
from support.blocks import SHIFTING_BLOCK, circuit_of

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit

LOW, HIGH = Domain(("vdd",), ("vss",)), Domain(("vddh",), ("vss",))
RAILS = ["vdd", "vdda", "vddh", "vss", "vssa"]


def by_hand(circuit: Circuit, gate: int) -> tuple[set[str], set[str]]:
    """Return high and low supplies at the ends of a gate's transistors, one by one."""
    devices, supplies, nets = circuit.devices, circuit.supplies, set[int]()
    for device in circuit.gate_devices(gate).tolist():
        nets |= {int(devices.drain[device]), int(devices.source[device])}
    high, low = (
        {net for net in nets if which[net]} for which in (supplies.is_high, supplies.is_low)
    )
    return {devices.net_names[n] for n in high}, {devices.net_names[n] for n in low}


def test_every_gate_is_on_what_its_transistors_hang_on() -> None:
    circuit = circuit_of(SHIFTING_BLOCK)
    found = gate_domains(circuit)
    for gate in range(len(circuit)):
        domain = found.of(gate)
        assert (set(domain.high), set(domain.low)) == by_hand(circuit, gate)
    assert found.domains == (LOW, HIGH, Domain((), ()))


@given(
    st.lists(
        st.tuples(*[st.sampled_from(RAILS[:3])] * 2, st.sampled_from(RAILS[3:])),
        min_size=1,
        max_size=6,
    )
)
def test_alike_gates_on_any_rails_are_told_apart(rails: list[tuple[str, str, str]]) -> None:
    cards = [
        f"mn{i} y{i} a{i} m{i} {low} nx w=1u l=0.1u\nmm{i} m{i} b{i} {low} {low} nx w=1u l=0.1u\n"
        f"mp{i} y{i} a{i} {one} {one} px w=1u l=0.1u\nmq{i} y{i} b{i} {two} {two} px w=1u l=0.1u"
        for i, (one, two, low) in enumerate(rails)
    ]
    names = " ".join(RAILS)
    text = "\n".join(["* t", f".subckt top {names}", *cards, ".ends", ""])
    circuit = circuit_of(text)
    found = gate_domains(circuit)
    told = [(set(found.of(i).high), set(found.of(i).low)) for i in range(len(circuit))]
    assert told == [by_hand(circuit, i) for i in range(len(circuit))]
    assert told == [({one, two}, {low}) for one, two, low in rails]
    assert len(set(found.domains)) == len(found.domains) == len(np.unique(found.index))
    assert are_several(found.domains) == any(len(set(column)) > 1 for column in [
        [net for one, two, _ in rails for net in (one, two)], [low for *_, low in rails],
    ])  # fmt: skip


def entries(circuit: Circuit, subcircuit: str) -> list[Entry]:
    return [one for one in take_inventory(circuit).entries if one.subcircuit == subcircuit]


def test_one_cell_on_two_supplies_is_two_entries() -> None:
    """Two and one in each level shifter on the low one, one and one in each on the high one."""
    found = entries(circuit_of(SHIFTING_BLOCK), "inv")
    assert [(one.supplies, one.count, one.function) for one in found] == [
        (LOW, 4, "!a"),
        (HIGH, 3, "!a"),
    ]


def test_storage_is_on_the_supplies_of_what_drives_it() -> None:
    stored = {one.kind: one.supplies for one in take_inventory(circuit_of(SHIFTING_BLOCK)).stored}
    assert stored == {"storage cell": HIGH, "loop that never holds": HIGH}


def test_rails_that_no_call_passes_on_are_gathered() -> None:
    lost = ".subckt lost a y\nmn y a vss vss nx w=1u l=0.1u\nmp y a vdd vdd px w=1u l=0.1u\n.ends\n"
    block = (
        ".subckt top a y vdd vss\nx1 a b lost\nx2 b c lost\n"
        "mn y c vss vss nx w=1u l=0.1u\nmp y c vdd vdd px w=1u l=0.1u\n.ends\n"
    )
    circuit = circuit_of(f"* t\n{lost}{block}")
    (own,), (gathered,) = entries(circuit, "top"), entries(circuit, "lost")
    assert own.supplies == LOW
    assert (gathered.supplies, gathered.count) == (Domain(("*.vdd",), ("*.vss",)), 2)
    told = gate_domains(circuit)
    high = {circuit.gate_name(i): told.of(i).high for i in range(len(circuit))}
    assert high == {"x1": ("x1.vdd",), "x2": ("x2.vdd",), "mn": ("vdd",)}


def test_one_pair_is_not_several() -> None:
    assert not are_several([LOW, Domain((), ("vss",)), Domain((), ())])
    assert are_several([LOW, Domain(("vdd",), ("0",))])
    assert are_several([LOW, HIGH])
