"""Which definition a call means where several have the name it calls.

Names are read in any case. Where two definitions differ otherwise too, and their names by case
alone, the case counts for these names. A definition inside another one is known there first; it is
known everywhere if no other has its name.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Mapping


@dataclass(frozen=True, slots=True)
class Callees:
    """Names that mean different definitions.

    Parameters
    ----------
    local : Mapping of (str, str) to str
        By the key of the calling definition and a lower-case name: the key of the definition
        inside it, or around it, that has the name.
    spellings : Mapping of str to Mapping of str to str
        By lower-case name and spelling: the key of the definition spelt so.
    """

    local: Mapping[tuple[str, str], str] = field(default_factory=dict)
    spellings: Mapping[str, Mapping[str, str]] = field(default_factory=dict)

    def key(self, scope: str, name: str) -> str:
        """Return the key of the definition that a call means.

        Parameters
        ----------
        scope : str
            Key of the definition that holds the call; empty: the top level.
        name : str
            As written. A spelling no definition has means the last one.
        """
        lower = name.lower()
        known = self.local.get((scope, lower))
        if known is not None:
            return known
        spelt = self.spellings.get(lower)
        return lower if spelt is None else spelt.get(name, list(spelt.values())[-1])

    def all_keys(self, scope: str, name: str) -> set[str]:
        """Return the keys of all definitions that calls of a lower-case name may mean."""
        return {self.key(scope, name), *self.spellings.get(name, {}).values()}


def local_names(parents: Mapping[str, str], names: Mapping[str, str]) -> dict[tuple[str, str], str]:
    """Return what names mean inside definitions.

    Parameters
    ----------
    parents : Mapping of str to str
        By the key of each definition that of the one around it; empty: the top level.
    names : Mapping of str to str
        By the key of each definition that is only known locally its lower-case name.
    """
    inside: dict[str, dict[str, str]] = {}
    for key, name in names.items():
        inside.setdefault(parents[key], {})[name] = key
    local: dict[tuple[str, str], str] = {}
    for scope in parents:
        around = scope
        while around:
            for name, key in inside.get(around, {}).items():
                local.setdefault((scope, name), key)
            around = parents[around]
    return local
