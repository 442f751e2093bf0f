"""Gates of two pull networks that leave their output alone for some inputs.

Tri-state and clocked inverters; the C-element, which moves when all its inputs agree and keeps its
output while they differ (Muller and Bartky, A theory of asynchronous circuits, 1959, from memory);
and stages of true single-phase clocking, in which the clock is in one of the two networks only, so
that one edge waits for it and the other does not (Yuan and Svensson, High-speed CMOS circuit
technique, IEEE Journal of Solid-State Circuits 24(1), 1989, from memory).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.circuit.drivers import enabled_function
from evenstage.circuit.function import conduction
from evenstage.circuit.gate import GateForm, Pulls, Unrecognised, all_arcs, possible_vectors
from evenstage.circuit.kinds.paths import single_output
from evenstage.circuit.network import HIGH, LOW, merge

if TYPE_CHECKING:
    from evenstage.circuit.context import Context
    from evenstage.circuit.network import Network, Switch

TRI_STATE = "tri-state gate"
C_ELEMENT = "C-element"
SINGLE_PHASE = "single-phase stage"


def floating(devices: tuple[Switch, ...], context: Context) -> GateForm | Unrecognised:
    """Recognise a gate whose output floats for some inputs."""
    network = merge(devices)
    output = single_output(network, context)
    if output is None:
        return Unrecognised("not one output alone")
    up, down = network.conducts(output, HIGH, "p"), network.conducts(output, LOW, "n")
    possible = possible_vectors(network, context.complements)
    anyhow_up, anyhow_down = network.conducts(output, HIGH), network.conducts(output, LOW)
    if ((anyhow_up != up) | (anyhow_down != down))[possible].any():
        return Unrecognised("an n switch pulls up or a p switch pulls down")
    if (up & down)[possible].any():
        return Unrecognised("pull-up and pull-down conduct together: not complementary")
    if not (up & possible).any() or not (down & possible).any():
        return Unrecognised("its output is only pulled one way")
    arcs = all_arcs(network, output, Pulls(up, down, possible), context.complements)
    if not arcs:
        return Unrecognised("no input moves its output")
    return GateForm(
        drawn=devices,
        network=network,
        output=output,
        pull_down=conduction(network, output, LOW, "n"),
        arcs=arcs,
        kind=_kind(network, output, context),
        floats=True,
        function=enabled_function(network, output, context.complements),
    )


def _kind(network: Network, output: int, context: Context) -> str:
    if is_c_element(network, output):
        return C_ELEMENT
    by_polarity = [{s.gate for s in network.switches if s.polarity == p} for p in "np"]
    alone = by_polarity[0] ^ by_polarity[1]
    return SINGLE_PHASE if len(alone) == 1 and alone <= set(context.clocks) else TRI_STATE


def is_c_element(network: Network, output: int) -> bool:
    """Tell whether an output rises when all of several inputs are 0 and falls when all are 1."""
    if len(network.inputs) < 2 or HIGH not in network.at_node or LOW not in network.at_node:
        return False
    up, down = network.conducts(output, HIGH, "p"), network.conducts(output, LOW, "n")
    none, every = ~network.vectors.any(axis=0), network.vectors.all(axis=0)
    return bool((up == none).all() and (down == every).all())
