"""Which subcircuit is meant when nobody says."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import ElaborationError
from evenstage.netlist.wording import counted, listed, nearest

if TYPE_CHECKING:
    from evenstage.brief import Brief
    from evenstage.netlist.netlist import Netlist, Subcircuit


class AmbiguousTopError(ElaborationError):
    """Several subcircuits could be meant.

    Parameters
    ----------
    message : str
        What to tell the user.
    names : tuple of str
        The subcircuits.
    """

    def __init__(self, message: str, names: tuple[str, ...]) -> None:
        super().__init__(message, code="ambiguous-top")
        self.names = names


_COPY = re.compile(r"(.+)_s[0-9]+")
"""Name of a sized copy, and in it that of the leaf it was made of."""


def choose_top(netlist: Netlist, top: str | None, brief: Brief | None) -> str:
    """Return the lower-case name of the subcircuit to elaborate; empty: the top level of the text.

    The name given counts first, then that of the brief, then the top level if it holds transistors
    or calls, then the only subcircuit nobody calls (of several,
    the only one that holds transistors or calls).

    Raises
    ------
    ElaborationError
        If there is no such subcircuit, or no single one to choose.
    """
    wanted = top or (brief.top if brief is not None else None)
    if wanted:
        return _named(netlist, wanted)
    if _has_devices(netlist, netlist.top):
        return ""
    candidates = _uncalled(netlist)
    if len(candidates) == 1:
        return candidates[0].name.lower()
    if not netlist.subcircuits:
        message = f"'{netlist.sources[0].label}' holds no transistor and no subcircuit"
        notes = tuple(str(notice) for notice in netlist.notices if notice.code == "title")
        raise ElaborationError(message, code="no-top", notes=notes)
    if not candidates:
        message = "every subcircuit is called by another; name the one to work on with --top"
        raise ElaborationError(message, code="no-top")
    names = [subcircuit.name for subcircuit in candidates]
    message = (
        f"{counted(len(names), 'subcircuit')} could be meant; "
        f"name the one to work on with --top: {listed(names)}"
    )
    raise AmbiguousTopError(message, tuple(names))


def _named(netlist: Netlist, wanted: str) -> str:
    for key in (netlist.callees.key("", wanted), wanted.lower()):
        if key in netlist.subcircuits:
            return key
    names = [subcircuit.name for subcircuit in netlist.subcircuits.values()]
    hint = nearest(wanted, names)
    if not hint and names:
        hint = f"; there are {listed(names)}"
    raise ElaborationError(f"there is no subcircuit '{wanted}'{hint}", code="unknown-top")


def _has_devices(netlist: Netlist, subcircuit: Subcircuit) -> bool:
    return any(cards.letter in "mx" for cards in netlist.cards.columns(subcircuit.cards))


def _uncalled(netlist: Netlist) -> list[Subcircuit]:
    """Return the definitions nobody calls, in reading order; empty ones only if all are."""
    called: set[str] = set()
    filled: set[str] = set()
    for key, subcircuit in netlist.subcircuits.items():
        for cards in netlist.cards.columns(subcircuit.cards):
            if cards.letter == "x":
                words = netlist.cards.words.some(np.unique(cards.targets))
                called.update(*(netlist.callees.all_keys(key, _name(word)) for word in words))
            if cards.letter in "mx":
                filled.add(key)
    # A leaf whose callers all call sized copies of it is no block of its own.
    replaced = {match[1] for key in called if (match := _COPY.fullmatch(key))}
    uncalled = [key for key in netlist.subcircuits if key not in called | replaced]
    keys = [key for key in uncalled if key in filled] or uncalled
    return [netlist.subcircuits[key] for key in keys]


def _name(target: bytes) -> str:
    return target.decode("utf-8", "surrogateescape").lower()
