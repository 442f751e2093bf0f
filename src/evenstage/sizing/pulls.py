"""Pull-up and pull-down of a gate as two sizes, and how far apart they may go.

Two sizes fit gates of two pull networks that do not fight: static complementary gates, tri-state
gates and C-elements without a keeper. In a ratioed or kept gate one network must overpower what the
other holds, and in a dynamic one the precharge is not on the timed edge; parts of a stage of
several gates conduct together. Those keep one size.

How far apart: the *skew* of a gate is the strength of its pull-up over that of its pull-down, the
resistance to the low supply over that to the high one along the weakest path of each; 1 is even. It
moves the switching threshold, and with it the noise margin of one level; gates skewed for speed are
drawn with one side half as strong (Sutherland, Sproull and Harris, Logical Effort, 1999, section
9.2, from memory). A gate drawn beyond the bounds may stay, and come nearer to them.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.circuit.kinds.floating import C_ELEMENT, TRI_STATE
from evenstage.errors import Notice
from evenstage.netlist.wording import counted
from evenstage.sizing.sides import sides_of

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.netlist.rewriting.handles import WidthHandles
    from evenstage.sizing.partition import Partition

_KINDS: Final = frozenset({"static gate", TRI_STATE, C_ELEMENT})
_NAMES_MAX: Final = 1000
_APART: Final = -1
_ONE_NUMBER: Final = "one number in the text sets both"


def pulled_apart(
    circuits: Sequence[Circuit], parts: Partition
) -> tuple[Partition, tuple[Notice, ...]]:
    """Give pull-up and pull-down of every gate that allows it a size each.

    Parameters
    ----------
    circuits : sequence of Circuit
        The block in each corner.
    parts : Partition
        With one size per gate.

    Returns
    -------
    parts : Partition
    notices : tuple of Notice
        Which gates keep one size, and why.
    """
    circuit = circuits[0]
    why, words = _why_together(circuits)
    one = np.zeros(len(parts), bool)
    one[parts.of_gate[why != _APART, 0]] = True
    first = np.cumsum(2 - one) - (2 - one)
    of_gate = np.stack([first, first + ~one], axis=1)[parts.of_gate[:, 0]].astype(np.int32)
    is_p = np.array([model.polarity == "p" for model in circuit.devices.models], bool)
    side = is_p[circuit.devices.model].astype(np.intp)
    nobody = np.concatenate([of_gate, np.full((1, 2), -1, np.int32)])
    of_device = nobody[circuit.gate_of_device, side]
    split = parts.with_sizes(of_gate, of_device, np.repeat(parts.handle, 2 - one))
    why[one[parts.of_gate[:, 0]] & (why == _APART)] = len(words)
    return split, _notices(circuit, why, [*words, "it shares its size with a gate that must"])


def tied_by_text(
    circuit: Circuit, parts: Partition, apart: WidthHandles, together: WidthHandles
) -> tuple[Partition, tuple[Notice, ...]]:
    """Put sides together again whose widths the text can only change together.

    Parameters
    ----------
    circuit : Circuit
    parts : Partition
        With sides apart.
    apart, together : WidthHandles
        How widths can be changed where each side has a size, and where each gate has one.
    """
    stuck = set(apart.cannot_change()) - set(together.cannot_change())
    held = np.zeros(len(parts), bool)
    held[[parts.variable_of[slot] for slot in sorted(stuck)]] = True
    again = held[parts.of_gate].any(axis=1) & (parts.of_gate[:, 0] != parts.of_gate[:, 1])
    if not again.any():
        return parts, ()
    label = np.arange(len(parts), dtype=np.int32)
    label[parts.of_gate[again, 1]] = parts.of_gate[again, 0]
    why = np.where(again, 0, _APART).astype(np.int32)
    return parts.tied(label), _notices(circuit, why, [_ONE_NUMBER])


def _why_together(circuits: Sequence[Circuit]) -> tuple[IntArray, list[str]]:
    """Return which reason keeps the sides of each gate together, `_APART` for none, and all."""
    circuit = circuits[0]
    words = ["it is part of a stage of several gates", "its sides do not act apart"]
    why = np.full(len(circuit), _APART, np.int32)
    mixed = np.any([sides_of(one).mixed for one in circuits], axis=0)
    why[mixed | ~np.isfinite(_skew(circuit))] = 1
    why[circuit.is_part] = 0
    for some in circuit.alike:
        form = some.form
        if form.kind not in _KINDS or form.weak:
            told = f"a {form.kind}, whose ratio stays as drawn"
            words += [told] if told not in words else []
            why[some.gates] = words.index(told)
    return why, words


def _notices(circuit: Circuit, why: IntArray, words: Sequence[str]) -> tuple[Notice, ...]:
    """Return one notice for each reason that counts somewhere."""
    found = []
    for number, reason in enumerate(words):
        gates = np.flatnonzero(why == number)
        verb = "keeps" if len(gates) == 1 else "keep"
        message = (
            f"{counted(len(gates), 'gate')} {verb} one size for pull-up and pull-down: {reason}"
        )
        names = tuple(circuit.gate_name(gate) for gate in gates[:_NAMES_MAX].tolist())
        found += [Notice("pulls-together", message, names=names)] if len(gates) else []
    return tuple(found)


@dataclass(frozen=True)
class Skews:
    """How far the sides of gates may go apart; shape ``(pairs,)`` each.

    Parameters
    ----------
    down, up : IntArray
        Sizes of a pull-down and of the pull-up of the same gates.
    least, most : FloatArray
        Of the size of the pull-up over that of the pull-down; 1 is as drawn.
    """

    down: IntArray
    up: IntArray
    least: FloatArray
    most: FloatArray

    def __len__(self) -> int:
        return len(self.down)

    def excess(self, sizes: FloatArray) -> FloatArray:
        """Return by what share each pair is beyond its bounds, shape (pairs,); <= 0: it is not."""
        ratio = sizes[self.up] / sizes[self.down]
        result: FloatArray = np.maximum(ratio / self.most, self.least / ratio) - 1
        return result


def skews(circuit: Circuit, parts: Partition, least: float, most: float) -> Skews:
    """Return how far the sides of all gates may go apart.

    Parameters
    ----------
    circuit : Circuit
    parts : Partition
    least, most : float
        Bounds of a gate's skew.
    """
    own = np.flatnonzero(parts.of_gate[:, 0] != parts.of_gate[:, 1])
    pairs, place = np.unique(parts.of_gate[own], axis=0, return_inverse=True)
    skew = _skew(circuit)[own]
    low, high = np.full(len(pairs), np.inf), np.zeros(len(pairs))
    np.minimum.at(low, place.ravel(), skew)
    np.maximum.at(high, place.ravel(), skew)
    return Skews(
        down=pairs[:, 0].astype(np.int32),
        up=pairs[:, 1].astype(np.int32),
        least=np.minimum(least / low, 1.0),
        most=np.maximum(most / high, 1.0),
    )


def _skew(circuit: Circuit) -> FloatArray:
    """Return the skew of every gate, shape (gates,); not finite where an edge has no arc."""
    arcs = circuit.arcs
    up, down = np.zeros(len(circuit)), np.zeros(len(circuit))
    for rising, weakest in ((True, up), (False, down)):
        mine = arcs.rising == rising
        np.maximum.at(weakest, arcs.gate[mine], arcs.output_resistance[mine])
    both = (up > 0) & (down > 0)
    found: FloatArray = np.divide(down, up, out=np.full(len(circuit), np.inf), where=both)
    return found
