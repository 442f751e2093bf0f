"""Which resistance and which capacitance of a circuit is its p transistors', which its n ones'.

Every resistance is inversely, every capacitance directly proportional to the widths behind it,
apart from what does not scale. So a second look at the circuit with all p transistors twice as wide
tells the sides apart: resistances of the pull-up halve and those of the pull-down stay, and by what
a capacitance has grown it is the p transistors'. A resistance that does neither is of both, as of a
transmission gate or of a load that is fought; its gate has one size for both sides.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.circuit.arcs import NO_OWNER

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray

#: Relative rounding of a difference of two sums.
_ROUNDING: Final = 1e-12


@dataclass(frozen=True)
class Sides:
    """What of a circuit belongs to pull-ups.

    Parameters
    ----------
    doubled : Circuit
        With every p transistor twice as wide.
    charge, term : IntArray, shape (charges,) and (own terms,)
        1 where the resistance of an arc's charge or own term is a pull-up's, else 0.
    term_delay : FloatArray, s, shape (own terms,)
        Part of each own term's delay whose capacitance is of p transistors.
    pin_cap : FloatArray, F, shape (pins,)
        The same of each pin's capacitance that scales.
    mixed : BoolArray, shape (gates,)
        Gates of which some resistance is neither the pull-up's alone nor the pull-down's.
    """

    doubled: Circuit
    charge: IntArray
    term: IntArray
    term_delay: FloatArray
    pin_cap: FloatArray
    mixed: BoolArray


def sides_of(circuit: Circuit) -> Sides:
    """Tell the sides of all gates of a circuit apart."""
    polarity = np.array([model.polarity == "p" for model in circuit.devices.models], bool)
    doubled = circuit.resized(np.where(polarity[circuit.devices.model], 2.0, 1.0))
    old, new = circuit.arcs, doubled.arcs
    mixed = np.zeros(len(circuit) + 1, bool)  # the last is nobody's
    side = []
    for before, after in ((old.charges, new.charges), (old.own, new.own)):
        owner = before.owner if before is old.charges else old.own.resistance_owner
        ratio = after.resistance / np.where(before.resistance > 0, before.resistance, 1.0)
        pulls_up = np.abs(ratio - 0.5) < _ROUNDING
        neither = ~pulls_up & (np.abs(ratio - 1.0) > _ROUNDING) & (before.resistance > 0)
        mixed[owner[neither & (owner != NO_OWNER)]] = True
        side.append(pulls_up.astype(np.int32))
    own, capacitance = old.own, sharing(old.own.capacitance, new.own.capacitance)
    return Sides(
        doubled=doubled,
        charge=side[0],
        term=side[1],
        term_delay=own.resistance * capacitance,
        pin_cap=sharing(circuit.pins.cap.scaling, doubled.pins.cap.scaling),
        mixed=mixed[:-1],
    )


def sharing(once: FloatArray, doubled: FloatArray) -> FloatArray:
    """Return which part of some sums grows with the p transistors, from the sums and those doubled.

    Parts that are all or nothing but for rounding are made so.
    """
    part = doubled - once
    part = np.where(np.abs(part) <= _ROUNDING * np.abs(once), 0.0, part)
    result: FloatArray = np.where(np.abs(part - once) <= _ROUNDING * np.abs(once), once, part)
    return result
