"""How strong transistors are of which only the resistance is known.

A chain of unit inverters, each stage four times the one before, so that every inverter drives four
of itself; two stages next to each other, far from both ends of the chain, give the mean of rise and
fall.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import SimulationError
from evenstage.simulation.crossings import last_crossing
from evenstage.simulation.equations import Equations
from evenstage.simulation.integrate import integrate
from evenstage.simulation.parameters import ROUNDING_SHARE, channels_of, known_channels
from evenstage.simulation.ramps import switching

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray
    from evenstage.process.process import Polarity, Process
    from evenstage.timing.results import Yardstick

#: A step is a ramp of this many FO4: shorter ones change nothing.
STEEPEST: Final = 0.01

_STAGES: Final = 7
_FANOUT: Final = 4.0
_PAIR: Final[tuple[Polarity, ...]] = ("n", "p")

#: Where only one current has to be found, each round takes about half of what is amiss.
_ROUNDS: Final = 12


def strength(process: Process, unit: Yardstick) -> float:
    """Return current times resistance, V, for the transistors whose currents are not known.

    With it the unit inverter's FO4 is the estimate's. Where its currents are known, the others
    follow the mean of theirs.

    Parameters
    ----------
    process : Process
        With its unit inverter filled in.
    unit : Yardstick
        Of the same process.
    """
    pair = [process.first(polarity) for polarity in _PAIR]
    known = [one.channel.current * one.r_w for one in pair if one.channel.current is not None]
    if len(known) == len(pair):
        return sum(known) / len(known)
    found = process.supply
    for _ in range(_ROUNDS if known else 1):
        found *= fo4(process, unit, found) / unit.fo4
    return found


def with_currents(process: Process, unit: Yardstick) -> Process:
    """Return a process that says all its channels need; currents that it does not say follow r_w.

    Contacts are left out, so with fixed resistances FO4 comes out a little shorter.

    Parameters
    ----------
    process : Process
        With its unit inverter filled in.
    unit : Yardstick
        Of the same process.
    """
    missing = any(kind.channel.current is None for kind in process.transistors)
    level = strength(process, unit) if missing else 0.0
    kinds = tuple(
        replace(
            kind,
            channel=channel
            if channel.current is not None
            else replace(channel, current=level / kind.r_w),
        )
        for kind, channel in zip(process.transistors, known_channels(process), strict=True)
    )
    return replace(process, transistors=kinds)


def fo4(process: Process, unit: Yardstick, strength: float) -> float:
    """Return the simulated delay of a unit inverter that drives four of itself, s.

    Parameters
    ----------
    process : Process
    unit : Yardstick
        For the scale of time and the first transition.
    strength : float
        V; see `strength`.

    Raises
    ------
    SimulationError
        ``no-edge`` where the inverter does not switch.
    """
    supply = process.supply
    ramps = switching(
        np.array([0.0, supply, 0.0]),
        np.array([0.0, supply, supply]),
        0.0,
        max(unit.transition_rise, STEEPEST * unit.fo4),
    )
    waves = integrate(
        _chain(process, strength),
        ramps,
        np.where(np.arange(_STAGES) % 2 == 0, supply, 0.0),
        (-10 * unit.fo4, 100 * unit.fo4),
        unit=unit.fo4,
        supply=supply,
    )
    first, last = (
        last_crossing(waves, stage, supply / 2, rising=stage % 2 == 1)
        for stage in (_STAGES - 4, _STAGES - 2)
    )
    if first is None or last is None:
        raise SimulationError(
            "the unit inverter of the process does not switch; check vto against the supply",
            code="no-edge",
        )
    return (last - first) / 2


def _chain(process: Process, strength: float) -> Equations:
    """Return the chain; its unknown nodes are the outputs, given are ground, supply and input."""
    known = known_channels(process)
    pair = [process.transistors.index(process.first(polarity)) for polarity in _PAIR]
    width_n = process.unit_width or 0.0
    width = np.array([width_n, width_n * (process.unit_ratio or 0.0)])
    kinds = [process.transistors[index] for index in pair]

    def of_pair(field: str) -> FloatArray:
        return np.array([getattr(kind, field) for kind in kinds], float)

    resistance = of_pair("r_w") / width + of_pair("r_fixed")
    per_width = np.array(
        [np.nan if k.channel.current is None else k.channel.current for k in kinds]
    )
    current = np.where(np.isnan(per_width), strength / resistance, per_width * width)
    over = np.array([known[index].overlap_drain or 0.0 for index in pair]) * width
    counted = np.array([known[index].overlap_count for index in pair]) * over
    still = of_pair("c_gate") * width + of_pair("c_gate_fixed") - counted
    drain = of_pair("c_drain") * width + of_pair("c_drain_fixed") - counted
    stage = np.repeat(np.arange(_STAGES), 2)
    size = _FANOUT**stage
    rail = np.tile([_STAGES, _STAGES + 1], _STAGES)
    entry = np.where(stage == 0, _STAGES + 2, stage - 1)
    return Equations(
        unknown=_STAGES,
        given=3,
        channels=channels_of(process, np.tile(pair, _STAGES), np.tile(current, _STAGES) * size),
        drain=stage,
        gate=entry,
        source=rail,
        bulk=rail,
        capacitor_ends=np.stack(
            [np.concatenate([entry, entry, stage]), np.concatenate([rail, stage, rail])]
        ),
        capacitance=np.concatenate(
            [np.tile(part, _STAGES) * size for part in (still, over, drain)]
        ),
        resistor_ends=np.zeros((2, 0), int),
        resistance=np.zeros(0),
        rounding=ROUNDING_SHARE * process.supply,
    )
