"""What a group with many inputs makes of them: by its ways to 1 and 0 instead of by a table.

A way is a simple path of channels from a net to a supply or to a net from outside, and the levels
that close it; a net with a way to a 1 and none to a 0 is 1, and one with a way to a 0 and none to a
1 is 0. What is fought over, or driven by nothing, may be anything. A multiplexer of n inputs has
some n ways, where its table would have ``2**n`` places.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Final, NamedTuple

from evenstage.logic.switches import UNKNOWN

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

LITERALS_MOST: Final = 20_000
"""Nets whose ways have more switches than this, added up, may be anything."""

_ALWAYS: Final = -1


class Way(NamedTuple):
    """Levels of nets that close a way, and where it ends: a level, or a net (level `UNKNOWN`)."""

    closing: tuple[tuple[int, bool], ...]
    level: int
    net: int


class Channel(NamedTuple):
    """A transistor of a group: its ends, the net at its gate, and the level that closes it."""

    a: int
    gate: int
    b: int
    closes: bool


@dataclass(frozen=True)
class WideRelation:
    """A net as its group makes it.

    Parameters
    ----------
    net : int
        Net id.
    inputs : tuple of int
        Net ids.
    channels : sequence of Channel
        Of the whole group.
    ends : dict of int to int
        Level of each net that the group does not drive; `UNKNOWN` where it is none of the supplies.
    levels : dict of int to int
        Level of each supply.
    phases : dict of int to (int, bool)
        Nets that are equal to another one, or its complement.
    """

    net: int
    inputs: tuple[int, ...]
    channels: Sequence[Channel]
    ends: dict[int, int]
    levels: dict[int, int]
    phases: dict[int, tuple[int, bool]] = field(default_factory=dict)

    @cached_property
    def ways(self) -> tuple[Way, ...] | None:
        """All ways of the net; None: there are too many."""
        found, literals = [], 0
        for way in self._found():
            found.append(way)
            literals += len(way.closing) + 1
            if literals > LITERALS_MOST:
                return None
        return tuple(dict.fromkeys(found))

    def _found(self) -> Iterator[Way]:
        at = self._edges()
        stack: list[tuple[int, dict[int, bool], frozenset[int]]] = [
            (self.net, {}, frozenset([self.net]))
        ]
        while stack:
            here, closing, seen = stack.pop()
            if here in self.ends:
                yield Way(tuple(sorted(closing.items())), self.ends[here], here)
                continue
            for there, gate, closes in at[here]:
                if there in seen or closing.get(gate, closes) != closes:
                    continue
                more = closing if gate == _ALWAYS else {**closing, gate: closes}
                stack.append((there, more, seen | {there}))

    def _edges(self) -> dict[int, list[tuple[int, int, bool]]]:
        """Return for each net where its channels lead, and what closes them, each once.

        That is the net that inverters make it from: the two transistors of a transmission gate are
        one, and no way leads through two that are never closed together.
        """
        at: dict[int, dict[tuple[int, int, bool], None]] = {}
        for a, gate, b, closes in self.channels:
            held = self.levels.get(gate, UNKNOWN)
            if held not in (UNKNOWN, closes):
                continue
            root, inverted = self.phases.get(gate, (gate, False))
            key = (root, closes != inverted) if held == UNKNOWN else (_ALWAYS, True)
            at.setdefault(a, {})[b, *key] = None
            at.setdefault(b, {})[a, *key] = None
        return {net: list(edges) for net, edges in at.items()}


def phases(inverters: dict[int, tuple[int, bool]]) -> dict[int, tuple[int, bool]]:
    """Return for each net that one other decides alone the first one of the chain.

    Parameters
    ----------
    inverters : dict of int to (int, bool)
        The one before, and whether it is the complement.
    """
    found = {}
    for net in inverters:
        here, inverted, passed = net, False, {net}
        while here in inverters and inverters[here][0] not in passed:
            here, more = inverters[here]
            inverted ^= more
            passed.add(here)
        found[net] = (here, inverted)
    return found
