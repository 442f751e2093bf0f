"""All values to be written for some wishes, and whom each concerns."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Final, NamedTuple

if TYPE_CHECKING:
    from collections.abc import Sequence
    from pathlib import Path

    from evenstage.netlist.rewriting.sized_block import SizedBlock, Slot
    from evenstage.netlist.rewriting.spelt_wishes import SpeltValue

#: How many grid steps, or which share, a width that hangs on another width's number may miss its
#: own wish: both were rounded apart.
_STEPS: Final = 3
_SHARE: Final = 0.01


class Key(NamedTuple):
    """A value in the text, for one caller of its leaf or (None) for everybody."""

    path: Path
    start: int
    end: int
    name: str
    caller: int | None


@dataclass(frozen=True, slots=True)
class Entry:
    """A value entered.

    Parameters
    ----------
    scope : str
        The leaf it is wanted for, else the subcircuit of the transistor, in lower case.
    value : SpeltValue
        What is written.
    """

    scope: str
    value: SpeltValue


@dataclass(frozen=True)
class Ledger:
    """Values entered so far; two wishes for one number must agree.

    Parameters
    ----------
    block : SizedBlock
        The block.
    entries : dict of Key to Entry
        In the order entered.
    """

    block: SizedBlock
    entries: dict[Key, Entry] = field(default_factory=dict)

    def enter(self, slot: Slot, spelt: Sequence[SpeltValue], width: float) -> Key | str:
        """Enter the values of one wish, or none of them.

        Parameters
        ----------
        slot : Slot
            Whose width.
        spelt : sequence of SpeltValue
            The width's own number first.
        width : float
            The width so far, m.

        Returns
        -------
        Key or str
            Of the value that sets the width; or why the wish cannot be met.
        """
        step = self.block.transistor(slot.card).width_step or 0.0
        room = max(_STEPS * step, _SHARE * width)
        scope = self.block.leaf(slot)
        keyed = {_key(slot, value): Entry(scope, value) for value in spelt}
        for key, entry in keyed.items():
            entered = self.entries.get(key, entry).value
            if abs(entered.factor - entry.value.factor) * width > room:
                number = f"{entered.respelling.name}={entered.respelling.old}"
                return f"{number} also sets another width, which changes by another factor"
        self.entries.update({k: e for k, e in keyed.items() if k not in self.entries})
        return _key(slot, spelt[0])


def _key(slot: Slot, value: SpeltValue) -> Key:
    respelling = value.respelling
    caller = None if value.way == "shared" else slot.caller
    span = respelling.span
    return Key(span.source.path, span.start, span.end, respelling.name.lower(), caller)
