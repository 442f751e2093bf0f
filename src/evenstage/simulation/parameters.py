"""What the transistors of a block are worth in a simulation: currents and linear capacitances.

The gate capacitance of the estimate is what a driver sees of a gate: the overlaps are part of it,
that with the drain once (from a card: twice); and likewise of ``c_drain``. Here the
overlaps are capacitors between gate and drain or source, and what is left goes to the bulk.

Where a process says no currents, they follow its resistances, ``current = strength / R`` for every
device, contacts included, and one ``strength`` is chosen so that an inverter that drives four of
itself, in an endless chain of such, takes as long as the estimate says. All capacitances are
constant, so a circuit whose currents are twice as large is exactly twice as fast, and one
simulation decides.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import Notice
from evenstage.process.generic import usual_channel
from evenstage.simulation.channel import Channels

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.process.process import Channel, Process

#: The rounding of the threshold, as a share of the supply.
ROUNDING_SHARE: Final = 0.01

#: Code of the notice that currents were chosen to agree with the estimate.
SCALED: Final = "current-scaled"


@dataclass(frozen=True, kw_only=True)
class Parameters:
    """Transistors for simulation, shape ``(devices,)`` each.

    Parameters
    ----------
    channels : Channels
    gate_bulk, gate_source, gate_drain, drain_bulk, source_bulk : FloatArray, F
        Capacitances.
    """

    channels: Channels
    gate_bulk: FloatArray
    gate_source: FloatArray
    gate_drain: FloatArray
    drain_bulk: FloatArray
    source_bulk: FloatArray


def known_channels(process: Process) -> tuple[Channel, ...]:
    """Return the channel of each transistor type, with the built-in values where it says none."""
    return tuple(usual_channel(kind, process.supply) for kind in process.transistors)


def _column(entries: list[float], kind: IntArray) -> FloatArray:
    """Return one entry for each device, of its type."""
    result: FloatArray = np.array(entries, float)[kind]
    return result


def channels_of(process: Process, kind: IntArray, current: FloatArray) -> Channels:
    """Return channels of given types and saturated currents at full drive (A), one each."""
    kinds, known = process.transistors, known_channels(process)

    def column(entries: list[float]) -> FloatArray:
        return _column(entries, kind)

    threshold = column([one.threshold or 0.0 for one in known])
    alpha = column([one.alpha or 0.0 for one in known])
    drive = process.supply - threshold
    return Channels(
        sign=column([1.0 if one.polarity == "n" else -1.0 for one in kinds]),
        threshold=threshold,
        gain=current / drive**alpha,
        alpha=alpha,
        knee=column([one.saturation or 0.0 for one in known]) / drive ** (alpha / 2),
        modulation=column([one.modulation for one in known]),
        body=column([one.body for one in known]),
        phi=column([one.phi for one in known]),
    )


def parameters(circuit: Circuit, strength: float) -> Parameters:
    """Return the parameters of all devices of a circuit.

    Parameters
    ----------
    circuit : Circuit
    strength : float
        V; saturated current at full drive times resistance, where a process says no current.
    """
    devices, process, values = circuit.devices, circuit.process, circuit.electrical
    kinds, known = process.transistors, known_channels(process)
    of_device = np.array([model.type_index for model in devices.models], int)[devices.model]

    def column(entries: list[float]) -> FloatArray:
        return _column(entries, of_device)

    width = devices.width * devices.multiplier
    lengths = devices.length / column([kind.length for kind in kinds])
    given = column([np.nan if one.current is None else one.current for one in known])
    current = np.where(np.isnan(given), strength / values.resistance.today, given * width / lengths)
    over_source = column([one.overlap_source or 0.0 for one in known]) * width
    over_drain = column([one.overlap_drain or 0.0 for one in known]) * width
    counted = column([one.overlap_count for one in known]) * over_drain
    by_area = column([0.0 if k.junctions is None else k.junctions.rise.overlap for k in kinds])
    no_area = column([1.0 if k.junctions is None else 0.0 for k in kinds]) > 0
    drain_wide = no_area | np.isnan(devices.drain_area + devices.drain_edge)
    source_wide = no_area | np.isnan(devices.source_area + devices.source_edge)
    return Parameters(
        channels=channels_of(process, of_device, current),
        gate_bulk=_rest(values.gate.today, over_source + counted),
        gate_source=over_source,
        gate_drain=over_drain,
        drain_bulk=_rest(values.drain.today, np.where(drain_wide, counted, by_area * width)),
        source_bulk=_rest(values.source.today, np.where(source_wide, counted, by_area * width)),
    )


def _rest(whole: FloatArray, part: FloatArray) -> FloatArray:
    """Return a capacitance without the overlap in it."""
    return np.maximum(whole - part, 0.0)


def assumption_notices(process: Process) -> tuple[Notice, ...]:
    """Say which values a simulation has to assume."""
    missing = {
        key: tuple(kind for kind in process.transistors if getattr(kind.channel, field) is None)
        for key, field in (("vto", "threshold"), ("alpha", "alpha"), ("cgdo", "overlap_drain"))
    }
    assumed = [key for key, kinds in missing.items() if kinds]
    notices = []
    if assumed:
        kinds = dict.fromkeys(kind for key in assumed for kind in missing[key])
        names = tuple(dict.fromkeys(p.text for kind in kinds for p in kind.models))
        notices.append(
            Notice(
                "channel-assumed",
                f"the process does not say {' and '.join(assumed)} of some transistors; they take"
                " those of the built-in generic process, as shares of supply and gate capacitance",
                names=names,
            )
        )
    if any(kind.channel.current is None for kind in process.transistors):
        notices.append(
            Notice(
                SCALED,
                "the process does not say currents (i_dsat or kp): they follow r_w, scaled so that"
                " an inverter that drives four of itself takes as long as estimated; that absolute"
                " times agree is then by construction, and only ratios are evidence",
            )
        )
    return tuple(notices)
