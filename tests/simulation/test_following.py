"""Both controls of a transmission gate move when a path comes by one of them."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from evenstage.process.process import Channel
from evenstage.simulation.excerpt import route_of
from evenstage.simulation.groups import Groups
from evenstage.simulation.simulate import simulate
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, plain_process
from support.pass_networks import transmission_gate

if TYPE_CHECKING:
    from evenstage.process.process import Process


def process() -> Process:
    """Return a process with slopes."""
    plain = plain_process(p_inv=0.7, slope=0.2, shape=1.8)
    channel = Channel(threshold=0.25, alpha=1.3)
    kinds = tuple(replace(kind, channel=channel) for kind in plain.transistors)
    return replace(plain, transistors=kinds)


SELECTOR = block(
    "\n".join([
        inverter("d", "d", "x", 1, 2), inverter("e", "e", "v", 1, 2),
        inverter("s", "s", "b", 1, 2), inverter("c", "b", "k", 1, 2),
        transmission_gate("t", "x", "w", "b", "k"), transmission_gate("u", "v", "w", "k", "b"),
        inverter("o", "w", "y", 2, 4), "cb b 0 5f\nck k 0 9f\ncy y 0 9f",
    ]),
    "d e s y vdd vss",
)  # fmt: skip


def test_the_second_control_is_made_by_its_inverter() -> None:
    circuit = circuit_of(SELECTOR, process())
    groups = Groups(circuit)
    (path,) = analyse(circuit, start="s").paths
    assert [stage.output for stage in path.stages] == ["b", "w", "y"]
    route = route_of(groups, path)
    second, first = circuit.net_id("k"), circuit.net_id("b")
    assert second is not None
    assert first is not None
    assert route.edges[second] == route.edges[first][::-1]
    assert route.beside == (int(groups.of_net[second]),)


def test_controls_from_outside_are_held_as_complements() -> None:
    cards = [
        inverter("d", "d", "x", 1, 2), transmission_gate("t", "x", "w", "s", "b"),
        inverter("o", "w", "y", 1, 2),
    ]  # fmt: skip
    circuit = circuit_of(block("\n".join(cards), "d s b y vdd vss"), process())
    held = dict(simulate(analyse(circuit, start="d")).before.paths[0].held)
    assert held == {"s": True, "b": False}
