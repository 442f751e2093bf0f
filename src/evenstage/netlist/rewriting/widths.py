"""From wished widths to edits of the text: which bytes change, and nothing else.

Numbers that serve one sizing variable are respelled where they stand. A leaf whose callers differ
keeps its text: they pass its parameters, or call copies of it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

from evenstage.netlist.rewriting.ledger import Key, Ledger
from evenstage.netlist.rewriting.settlement import settle, settle_defaults
from evenstage.netlist.rewriting.sized_block import Slot
from evenstage.netlist.rewriting.spelt_wishes import SpeltValue, spell_wish

if TYPE_CHECKING:
    from collections.abc import Iterable

    from evenstage.netlist.rewriting.edits import Edit
    from evenstage.netlist.rewriting.handles import WidthHandles
    from evenstage.netlist.rewriting.respelling import Respelling


@dataclass(frozen=True, slots=True, kw_only=True)
class WidthWish:
    """A new width for one slot.

    Parameters
    ----------
    card : int
        Number of the transistor card.
    caller : int or None
        Number of the X card that calls the leaf holding it, where that call is the variable.
    old, new : float
        Drawn width of one copy, all fingers together, m. Where devices of one slot differ in width,
        all of them change by ``new / old``.
    why : str
        For the comment above the card.
    """

    card: int
    caller: int | None = None
    old: float
    new: float
    why: str


@dataclass(frozen=True, slots=True, kw_only=True)
class WrittenWidth:
    """A width as it will be read back.

    Parameters
    ----------
    card, caller : int and int or None
        As wished.
    parameter : str
        Which parameter is written.
    file, line : str and int
        Where, before the change.
    old, new : float
        m; ``new`` differs from the wish where several widths hang on one number.
    """

    card: int
    caller: int | None
    parameter: str
    file: str
    line: int
    old: float
    new: float


@dataclass(frozen=True, slots=True)
class WidthPlan:
    """What becomes of some wishes.

    Parameters
    ----------
    edits : tuple of Edit
        For ``rewrite``.
    written : tuple of WrittenWidth
        In the order of the wishes.
    refused : tuple of (WidthWish, str)
        What stays as it is, and why.
    left : tuple of str
        Leaves that stay in the text though all their callers call copies now.
    """

    edits: tuple[Edit, ...]
    written: tuple[WrittenWidth, ...]
    refused: tuple[tuple[WidthWish, str], ...]
    left: tuple[str, ...] = ()


def plan_widths(handles: WidthHandles, wishes: Iterable[WidthWish]) -> WidthPlan:
    """Turn wished widths into edits.

    Parameters
    ----------
    handles : WidthHandles
        The block, its variables and how each width can be changed.
    wishes : iterable of WidthWish
        At most one per slot. Callers of a leaf that are not wished for keep their widths.

    Raises
    ------
    ValueError
        If a leaf would need more copies than ``copies_per_leaf``: sizes are clustered before.
    """
    block = handles.block
    ledger = Ledger(block)
    refused: list[tuple[WidthWish, str]] = []
    keys: list[tuple[WidthWish, Key]] = []
    for wish in sorted(wishes, key=lambda w: (w.card, -1 if w.caller is None else w.caller)):
        if math.isclose(wish.new, wish.old, rel_tol=1e-9):
            continue
        slot = Slot(wish.card, wish.caller)
        spelt = spell_wish(block, handles[slot], wish.old, wish.new, wish.why)
        entered = spelt if isinstance(spelt, str) else ledger.enter(slot, spelt, wish.old)
        if isinstance(entered, str):
            refused.append((wish, entered))
        else:
            keys.append((wish, entered))
    defaults = settle_defaults(block, ledger.entries)
    edits, left = settle(block, ledger.entries, defaults)
    return WidthPlan(
        edits=tuple(edits),
        written=tuple(_written(wish, ledger.entries[k].value, defaults.get(k)) for wish, k in keys),
        refused=tuple(refused),
        left=tuple(left),
    )


def _written(wish: WidthWish, value: SpeltValue, settled: Respelling | None) -> WrittenWidth:
    """Return what will be read back for a wish (inside a leaf, the place is the original's)."""
    respelling = settled or value.respelling
    source = respelling.span.source
    return WrittenWidth(
        card=wish.card,
        caller=wish.caller,
        parameter=respelling.name,
        file=source.label,
        line=source.line_number(respelling.span.start),
        old=wish.old,
        new=wish.old * value.factor,
    )
