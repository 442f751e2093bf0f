"""Who gets a value where callers of a leaf may differ: all of them, the calling card, or a copy."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import replace
from typing import TYPE_CHECKING

from evenstage.netlist.copies import insertions, plan_copies, retargetings, wishes_key
from evenstage.netlist.respelling import Respelling, edits_of
from evenstage.source import Span

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping

    from evenstage.netlist.copies import LeafCopy, Wanted
    from evenstage.netlist.edits import Edit
    from evenstage.netlist.ledger import Entry, Key
    from evenstage.netlist.sized_block import SizedBlock


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
) -> list[Edit]:
    """Return the edits that write everything entered.

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
    wanted: dict[str, Mapping[int, list[Entry]]] = {}
    for scope, by_caller in _by_leaf(entries).items():
        agreed = _agreed(block, scope, by_caller)
        shared += agreed
        if not agreed:
            wanted[scope] = by_caller
    copies = _copies(block, wanted)
    shared += retargetings(block.netlist, copies)
    # At one place a copy comes before the comment of the card that follows it.
    return [*insertions(block.netlist, copies, shared), *edits_of(shared)]


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


def _by_leaf(entries: Mapping[Key, Entry]) -> dict[str, dict[int, list[Entry]]]:
    """Return what is wished inside leaves, by leaf and caller."""
    leaves: dict[str, dict[int, list[Entry]]] = {}
    for key, entry in entries.items():
        if entry.value.way in {"leaf", "detached"} and key.caller is not None:
            leaves.setdefault(entry.scope, {}).setdefault(key.caller, []).append(entry)
    return leaves


def _agreed(
    block: SizedBlock, scope: str, by_caller: Mapping[int, list[Entry]]
) -> list[Respelling]:
    """Return what is respelled in a leaf itself because all its callers want it, else nothing."""
    entries = [entry for group in by_caller.values() for entry in group]
    wishes = {wishes_key(e.value.respelling for e in group) for group in by_caller.values()}
    everybody = set(by_caller) == set(block.bindings.callers(scope))
    if any(e.value.way == "detached" for e in entries) or len(wishes) > 1 or not everybody:
        return []
    return [entry.value.respelling for entry in next(iter(by_caller.values()))]


def _copies(
    block: SizedBlock, wanted: Mapping[str, Mapping[int, Iterable[Entry]]]
) -> list[LeafCopy]:
    respellings: dict[str, Wanted] = {
        scope: {c: tuple(e.value.respelling for e in group) for c, group in by_caller.items()}
        for scope, by_caller in wanted.items()
    }
    copies = plan_copies(block.netlist, respellings)
    for scope in wanted:
        count = sum(copy.leaf.name.lower() == scope for copy in copies)
        if count > block.copies_per_leaf:
            raise ValueError(f"{count} copies of {scope}, {block.copies_per_leaf} allowed")
    return copies
