"""Where paths start and end, when signals arrive there and when they are needed."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import NoPathError, Notice
from evenstage.pattern import Pattern, nearest_names, select

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
        ends = _asked(circuit, end, np.unique(circuit.driven), "driven by any gate")
    return Endpoints(inputs, starts, ends, start is None and end is None)


def block_inputs(circuit: Circuit) -> IntArray:
    """Return the nets that load gates, that no gate drives and that are no supplies; by id."""
    has_pin = np.zeros(len(circuit.devices.net_names), bool)
    has_pin[circuit.pins.net] = True
    undriven = circuit.driver_of_net < 0
    return np.flatnonzero(has_pin & undriven & ~circuit.supplies.is_supply).astype(np.int32)


def undriven(circuit: Circuit, brief: Brief | None, found: Endpoints) -> tuple[Notice, ...]:
    """Return a notice if nets inside the block start paths that nothing drives.

    Such a net is no port and stands below the block's own level, or the block has ports; no
    channel, source or entry of the brief says where its signal comes from.
    """
    devices = circuit.devices
    explained = np.zeros(len(devices.net_names), bool)
    explained[[*devices.ports, *devices.global_nets]] = True
    explained[devices.drain] = explained[devices.source] = True
    for plus, minus, _ in devices.source_nets:
        explained[[plus, minus]] = True
    nets = found.inputs[~explained[found.inputs]].tolist()
    names = [devices.net_names[net] for net in nets]
    if not devices.ports:
        names = [n for n, inside in zip(names, _inside(circuit, nets), strict=True) if inside]
    given = [pattern for some in (brief.inputs if brief else ()) for pattern in some.nets]
    names = [name for name in names if not any(pattern.fits(name) for pattern in given)]
    if not names:
        return ()
    what = "one net inside the block" if len(names) == 1 else f"{len(names)} nets inside the block"
    message = (
        f"{what} that nothing drives, taken as inputs: {', '.join(names[:8])}"
        f"{' and others' if len(names) > 8 else ''}; [[input]] in the brief says that this is meant"
    )
    return (Notice("undriven-net", message, names=tuple(names)),)


def _inside(circuit: Circuit, nets: list[int]) -> list[bool]:
    """Tell which nets belong to an instance, by the path before their names."""
    devices = circuit.devices
    gate_of_net = np.full(len(devices.net_names), -1)
    gate_of_net[circuit.pins.net] = circuit.pins.gate
    found = []
    for net in nets:
        name = devices.net_names[net]
        instance = int(circuit.gate_instance[int(gate_of_net[net])])
        while instance > 0 and not name.startswith(f"{devices.instance_path(instance)}."):
            instance = int(devices.instance_parent[instance])
        found.append(instance > 0)
    return found


def _asked(circuit: Circuit, wanted: str, among: IntArray, what: str) -> IntArray:
    names = circuit.devices.net_names
    pattern = Pattern(wanted)
    chosen = [net for net in among.tolist() if pattern.fits(names[net])]
    if not chosen:
        known = circuit.net_id(wanted)
        problem = f"net '{wanted}' is not {what}" if known is not None else f"no net '{wanted}'"
        near = nearest_names(wanted, (names[net] for net in among.tolist()), 1)
        hint = f"; did you mean '{near[0]}'?" if near else ""
        raise NoPathError(
            f"{problem} in '{circuit.devices.top or 'the top level'}'{hint}", code="no-path"
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
    names = [circuit.devices.net_names[net] for net in circuit.driven] if given else []
    for some in given:
        if some.required is not None:
            chosen = circuit.driven[select(some.nets, names, "driven net")]
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
