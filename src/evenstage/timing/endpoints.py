"""Where paths start and end, when signals arrive there and when they are needed."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import NoPathError
from evenstage.pattern import Pattern, select

if TYPE_CHECKING:
    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.timing.results import Yardstick


Edges = tuple["IntArray", "BoolArray"]
"""Net ids, and whether each rises; shape (edges,)."""


@dataclass(frozen=True)
class Endpoints:
    """Which nets start paths and which end them.

    Parameters
    ----------
    inputs : IntArray
        Net ids where paths begin unless asked otherwise.
    starts, ends : IntArray
        Net ids, as asked for.
    whole : bool
        Whether nothing narrower than the whole block was asked for.
    """

    inputs: IntArray
    starts: IntArray
    ends: IntArray
    whole: bool


def endpoints(circuit: Circuit, start: str | None, end: str | None) -> Endpoints:
    """Find the nets that start and end paths.

    Parameters
    ----------
    circuit : Circuit
    start, end : str, optional
        Net names (wildcards allowed) that paths must start from or end at.

    Raises
    ------
    NoPathError
        Where no such net can start or end a path.
    """
    nets = len(circuit.devices.net_names)
    has_pin = np.zeros(nets, bool)
    has_pin[circuit.pins.net] = True
    inputs = block_inputs(circuit)
    starts, ends = inputs, np.array(list(circuit.ends), np.int32)
    if start is not None:
        starts = _asked(circuit, start, np.flatnonzero(has_pin), "an input of any gate")
    if end is not None:
        ends = _asked(circuit, end, np.unique(circuit.gate_output), "driven by any gate")
    return Endpoints(inputs, starts, ends, start is None and end is None)


def block_inputs(circuit: Circuit) -> IntArray:
    """Return the nets that load gates, that no gate drives and that are no supplies; by id."""
    has_pin = np.zeros(len(circuit.devices.net_names), bool)
    has_pin[circuit.pins.net] = True
    undriven = circuit.driver_of_net < 0
    return np.flatnonzero(has_pin & undriven & ~circuit.supplies.is_supply).astype(np.int32)


def _asked(circuit: Circuit, wanted: str, among: IntArray, what: str) -> IntArray:
    names = circuit.devices.net_names
    pattern = Pattern(wanted)
    chosen = [net for net in among.tolist() if pattern.fits(names[net])]
    if not chosen:
        known = circuit.net_id(wanted)
        problem = f"net '{wanted}' is not {what}" if known is not None else f"no net '{wanted}'"
        raise NoPathError(
            f"{problem} in '{circuit.devices.top or 'the top level'}'", code="no-path"
        )
    return np.array(chosen, np.int32)


def arrivals_from_outside(
    circuit: Circuit, unit: Yardstick, brief: Brief | None, found: Endpoints, edges: Edges
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return arrival (s), transition (s) and drive (ohm) of the edges that start paths.

    Raises
    ------
    SettingsError
        Where a pattern of the brief fits no input.
    """
    nets, rising = edges
    arrival, drive = np.zeros(len(nets)), np.zeros(len(nets))
    transition = np.where(rising, unit.transition_rise, unit.transition_fall)
    given = brief.inputs if brief else ()
    known = np.union1d(found.inputs, found.starts)
    names = [circuit.devices.net_names[net] for net in known.tolist()] if given else []
    for some in given:
        chosen = np.isin(nets, known[select(some.nets, names, "input")])
        arrival[chosen] = some.arrival
        drive[chosen] = some.drive
        if some.transition is not None:
            transition[chosen] = some.transition
    return arrival, transition, drive


def required_times(circuit: Circuit, brief: Brief | None, nets: IntArray) -> FloatArray:
    """Return the required time of each net, s; NaN where the brief does not say.

    Raises
    ------
    SettingsError
        Where a pattern of the brief fits no driven net.
    """
    required = np.full(len(nets), np.nan)
    given = brief.outputs if brief else ()
    names = [circuit.devices.net_names[net] for net in circuit.gate_output] if given else []
    for some in given:
        if some.required is not None:
            chosen = circuit.gate_output[select(some.nets, names, "driven net")]
            required[np.isin(nets, chosen)] = some.required
    return required


def no_path(
    circuit: Circuit, found: Endpoints, *, start: str | None, end: str | None
) -> NoPathError:
    """Say why no path is left between endpoints."""
    where = f"in '{circuit.devices.top or 'the top level'}'"
    if not len(found.starts):
        return NoPathError(
            f"no input {where}: every gate input is driven by a gate or tied to a supply; its "
            "gates form loops without a way in",
            code="loop-without-entry",
        )
    asked = " ".join(f"{word} '{net}'" for word, net in (("from", start), ("to", end)) if net)
    return NoPathError(
        f"no path {asked + ' ' if asked else ''}{where}: no input reaches such an end along "
        "recognised gates, loops cut and ignored paths left out",
        code="no-path",
    )
