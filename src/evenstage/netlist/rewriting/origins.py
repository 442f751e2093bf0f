"""Which numbers in the text set a width, and whether they may be changed.

A number may be changed where it serves the widths, areas and perimeters of one sizing variable and
nothing else, and the width is in proportion to it. A number inside a leaf may also be changed in a
copy of the leaf. Files outside the folder of the main file are never edited.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final, Literal

from evenstage.netlist.rewriting.mentions import names_in
from evenstage.netlist.rewriting.sized_block import Slot
from evenstage.netlist.rewriting.spelling import is_number

if TYPE_CHECKING:
    from evenstage.netlist.netlist import Card, Parameter
    from evenstage.netlist.rewriting.bindings import Use
    from evenstage.netlist.rewriting.sized_block import SizedBlock
    from evenstage.netlist.rewriting.tracing import Root
    from evenstage.source import Span

_FOLLOWING: Final = frozenset({"ad", "as", "pd", "ps", "nrd", "nrs", "area", "perim"})

Way = Literal["shared", "leaf", "default", "detached"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Origin:
    """A number in the text that sets a width.

    Parameters
    ----------
    parameter : Parameter
        The number; for "detached" the expression that a number replaces.
    way : {"shared", "leaf", "default", "detached"}
        "shared": respelled where it stands. "leaf": inside a leaf; respelled there if all callers
        agree, else in a copy. "default": of a leaf's ``.subckt`` card; respelled if all callers
        that rely on it agree, else the call passes the value. "detached": replaced by a number in
        a copy of the leaf.
    model : str
        The number whose spelling is followed.
    scope : str
        Lower-case name of the subcircuit that it stands in.
    """

    parameter: Parameter
    way: Way
    model: str
    scope: str


def find_origins(block: SizedBlock, slot: Slot) -> tuple[Origin, ...] | str:
    """Return the numbers that set a slot's width, or the reason why it is fixed."""
    card = block.card(slot.card)
    holder = card.scope if slot.caller is None else block.card(slot.caller).scope
    if (leaf := block.leaf_around(holder)) is not None:
        return f"'{holder}' stands in the leaf '{leaf}' too, which has sizes of its own"
    own = block.own_width(card)
    if own is None:
        return "its card gives no width"
    found: tuple[Origin, ...] | str
    if is_number(own.text):
        found = (Origin(parameter=own, way=_local(slot), model=own.text, scope=card.scope),)
    else:
        found = _from_parameters(block, slot, card, own)
    if isinstance(found, str):
        return found
    return next((why for o in found if (why := _obstacle(block, slot, o))), None) or found


def _local(slot: Slot) -> Way:
    """Return how a number on the transistor card itself is changed."""
    return "shared" if slot.caller is None else "leaf"


def _from_parameters(
    block: SizedBlock, slot: Slot, card: Card, own: Parameter
) -> tuple[Origin, ...] | str:
    """Return the numbers behind a width that is an expression."""
    traced = block.tracer_of(slot).roots(own.text, card.scope, block.ways(slot))
    if not traced:
        own_functions = [n for n in names_in(own.text) if n.endswith("()")]
        through = f", through {', '.join(own_functions)}" if own_functions else ""
        return f"its width {own.text} is not in proportion to parameters{through}"
    for roots in traced:
        if all(_serves_alone(block, slot, root) for root in roots):
            return tuple(_origin(block, root, slot) for root in sorted(roots, key=_place))
    if slot.caller is None or not block.copies_per_leaf or not block.is_drawn_once(slot):
        return f"its width {own.text} comes from a parameter that sets other things too"
    model = min(traced[0], key=_place).parameter.text
    return (Origin(parameter=own, way="detached", model=model, scope=card.scope),)


def _place(root: Root) -> tuple[str, int]:
    span = root.parameter.span
    return str(span.source.path), span.start


def _origin(block: SizedBlock, root: Root, slot: Slot) -> Origin:
    """Return how a number found by tracing is changed."""
    way: Way = "shared"
    scope = root.place.scope
    if root.kind == "passed" and root.place.caller is not None:
        scope = block.card(root.place.caller).scope
    if slot.caller is not None and block.leaf(slot) == root.place.scope:
        ways: dict[str, Way] = {"inside": "leaf", "default": "default", "passed": "shared"}
        way = ways[root.kind]
    elif slot.caller is not None and _is_below(block, slot, root.place.scope):
        way = "leaf"
    return Origin(parameter=root.parameter, way=way, model=root.parameter.text, scope=scope)


def _is_below(block: SizedBlock, slot: Slot, scope: str) -> bool:
    """Tell whether a definition is one that a slot's leaf calls, directly or through others."""
    return slot.caller is not None and scope in block.below(block.leaf(slot)).order[:-1]


def _serves_alone(block: SizedBlock, slot: Slot, root: Root) -> bool:
    """Tell whether a number serves nothing but the geometry of one variable's transistors."""
    leaf, scope = block.leaf(slot), root.place.scope
    inside = slot.caller is not None and (scope == leaf or _is_below(block, slot, scope))
    if not inside or leaf == block.card(slot.card).scope:
        variable = block.variable_of[slot]
        return all(_serves(block, use, variable) for use in block.bindings.uses(root.place))
    uses = block.tracer_of(slot).bindings.uses(root.place)
    return all(
        block.variable_of.get(Slot(use.card, slot.caller)) == block.variable_of[slot]
        and _is_geometry(block, use)
        for use in uses
    )


def _serves(block: SizedBlock, use: Use, variable: int) -> bool:
    """Tell whether a use is geometry of one of a variable's transistors, whoever calls them."""
    slots = (Slot(use.card, use.caller), Slot(use.card))
    mine = [block.variable_of[slot] for slot in slots if slot in block.variable_of]
    return bool(mine) and all(one == variable for one in mine) and _is_geometry(block, use)


def _is_geometry(block: SizedBlock, use: Use) -> bool:
    """Tell whether a use is the width of a transistor, or follows it."""
    return use.name in _FOLLOWING or use.name == block.width_name(block.card(use.card))


def _obstacle(block: SizedBlock, slot: Slot, origin: Origin) -> str:
    """Return why an origin cannot be changed after all, or nothing."""
    if origin.way != "default" and not block.is_editable(origin.parameter.span):
        return _outside(block, origin.parameter.span)
    caller = None if slot.caller is None else block.card(slot.caller)
    cards = [block.card(slot.card), *([] if caller is None else [caller])]
    scopes = [origin.scope, *(card.scope for card in cards)]
    towards: tuple[str, ...] = ()
    if caller is not None and origin.way in {"leaf", "detached"}:
        below = block.below(block.leaf(slot))
        towards = below.towards(origin.scope)
        calls = [number for name in towards for number, _ in below.calls[name]]
        cards += map(block.card, calls)
    if any(map(block.is_read_again, cards)):
        return "its file is included more than once, and one change would make several"
    for scope in (*scopes, *towards):
        if scope in block.defined_again:
            return f"'{scope}' is defined again at {block.defined_again[scope]}"
    if origin.way == "shared" or caller is None:
        return ""
    for span in (caller.span, *(block.body(name) for name in towards)):
        if not block.is_editable(span):
            return _outside(block, span)
    return "" if origin.way == "default" else _no_copy(block, slot, origin, towards)


def _outside(block: SizedBlock, span: Span) -> str:
    if span.source.path in block.netlist.rooted:
        return f"'{span.source.label}' is included by its full path, which leads to it for ever"
    return f"'{span.source.label}' lies outside the folder of the main file"


def _no_copy(block: SizedBlock, slot: Slot, origin: Origin, towards: tuple[str, ...]) -> str:
    """Return why a number inside a leaf cannot be changed for this call alone, or nothing.

    ``towards`` are the definitions through which the leaf reaches the number.
    """
    leaf = block.leaf(slot)
    if origin.way == "leaf" and block.is_one_for_all(slot, origin.scope):
        return ""
    if not block.copies_per_leaf:
        return f"callers of '{leaf}' share one size, and not all of them may change"
    for name in towards:
        if block.holds_definitions(name):
            return f"'{name}' holds further definitions and cannot be copied"
    family = block.family(leaf)
    if leaf == family.root and block.copies_called(family) >= block.copies_per_leaf:
        stays = "its width is a parameter's" if origin.way == "detached" else "others call it too"
        if origin.way == "detached" or block.is_called_elsewhere(leaf):
            return f"'{leaf}' has all the copies it may have, and cannot change itself: {stays}"
    return ""
