"""Who gets a value where callers of a leaf may differ: all of them, the calling card, or a copy."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import replace
from typing import TYPE_CHECKING

from evenstage.netlist.rewriting.calls import Calls
from evenstage.netlist.rewriting.copies import insertions
from evenstage.netlist.rewriting.families import removal
from evenstage.netlist.rewriting.placing import Placing
from evenstage.netlist.rewriting.respelling import Respelling, edits_of
from evenstage.netlist.rewriting.stock import Stock
from evenstage.source import Span

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.netlist.rewriting.edits import Edit
    from evenstage.netlist.rewriting.families import Family
    from evenstage.netlist.rewriting.ledger import Entry, Key
    from evenstage.netlist.rewriting.sized_block import SizedBlock


def settle_defaults(block: SizedBlock, entries: Mapping[Key, Entry]) -> dict[Key, Respelling]:
    """Return where each wished default of a leaf is written.

    Where all calls that rely on the default agree, it is respelled itself; else each call that
    wants another value passes it.
    """
    groups: defaultdict[Key, list[Key]] = defaultdict(list)
    for key, entry in entries.items():
        if entry.value.way == "default":
            groups[key._replace(caller=None)].append(key)
    settled = {}
    for keys in groups.values():
        wished = {key: entries[key].value.respelling for key in keys}
        if _all_agree(block, entries[keys[0]].scope, wished):
            settled.update(dict.fromkeys(keys, wished[keys[0]]))
        else:
            settled.update({key: _passed(block, key, wished[key]) for key in keys})
    return settled


def settle(
    block: SizedBlock, entries: Mapping[Key, Entry], defaults: Mapping[Key, Respelling]
) -> tuple[list[Edit], list[str]]:
    """Return the edits that write everything entered, and the leaves nobody calls any more.

    Parameters
    ----------
    block : SizedBlock
        The block.
    entries : Mapping of Key to Entry
        All of them.
    defaults : Mapping of Key to Respelling
        From ``settle_defaults``.

    Raises
    ------
    ValueError
        If a leaf would need more copies than allowed: a fault of ours.
    """
    shared = [e.value.respelling for e in entries.values() if e.value.way == "shared"]
    # Calls that agree share one respelling of the default.
    shared += dict.fromkeys(defaults.values())
    stock = Stock(block, shared)
    placings = [Placing(stock, *wished) for wished in _by_family(block, entries).items()]
    # What leaves with subcircuits change or call decides what else may become of these.
    for placing in sorted(placings, key=lambda p: block.below(p.family.root).is_flat):
        placing.place()
    moves = [move for placing in placings for move in placing.moves()]
    everywhere = (*shared, *moves)
    calls = Calls(stock, {c: target for p in placings for c, target in p.calls.items()})
    unused = calls.unused()
    structure = [
        *(removal(stock.definition(name)) for name in unused),
        *insertions(block.netlist, stock.copies.values(), everywhere),
        *calls.told(unused),
    ]
    gone = [edit.span for edit in structure if not edit.text]
    kept = [
        r for r in (*everywhere, *stock.in_place) if not any(_is_within(r.span, g) for g in gone)
    ]
    # At one place a copy comes before the comment of the card that follows it.
    left = [name for placing in placings for name in placing.left]
    return [*structure, *edits_of(kept)], left


def _all_agree(block: SizedBlock, scope: str, wished: Mapping[Key, Respelling]) -> bool:
    """Tell whether every call that relies on a default wants the same instead."""
    first = next(iter(wished.values()))
    name = first.name.lower()
    relying = {
        caller
        for caller in block.bindings.callers(scope)
        if caller is not None and block.card(caller).parameter(name) is None
    }
    same = len({respelling.new for respelling in wished.values()}) == 1
    return same and relying == {key.caller for key in wished} and block.is_editable(first.span)


def _passed(block: SizedBlock, key: Key, default: Respelling) -> Respelling:
    """Return what passes a value in place of a default."""
    assert key.caller is not None
    span = block.card(key.caller).span
    return replace(default, span=Span(span.source, span.end, span.end))


def _by_family(
    block: SizedBlock, entries: Mapping[Key, Entry]
) -> dict[Family, dict[int, list[Entry]]]:
    """Return what is wished inside leaves, by family and caller."""
    wished: dict[Family, dict[int, list[Entry]]] = {}
    for key, entry in entries.items():
        if entry.value.way in {"leaf", "detached"} and key.caller is not None:
            family = block.family(entry.scope)
            wished.setdefault(family, {}).setdefault(key.caller, []).append(entry)
    return wished


def _is_within(inner: Span, outer: Span) -> bool:
    same = inner.source.path == outer.source.path
    return same and outer.start <= inner.start and inner.end <= outer.end
