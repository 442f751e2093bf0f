"""The ``.model`` cards of a netlist while it is read: those of everybody, those of a subcircuit."""

from __future__ import annotations

import re
from contextlib import suppress
from typing import TYPE_CHECKING, Final, NamedTuple

from evenstage.errors import ElaborationError
from evenstage.netlist.callees import local_names
from evenstage.netlist.netlist import ModelCard

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping

    from evenstage.netlist.netlist import Parameter
    from evenstage.netlist.parameters import Scope
    from evenstage.netlist.reading.scopes import Scopes
    from evenstage.source import Span

#: Ends the names of the bins of one model.
_BIN: Final = re.compile(r"\.\d+$")


class WrittenModel(NamedTuple):
    """A ``.model`` card as written."""

    name: str
    kind: str
    parameters: tuple[Parameter, ...]
    span: Span


class ModelCards:
    """All ``.model`` cards; a later one replaces an earlier one of its name and place."""

    def __init__(self) -> None:
        self._found: dict[tuple[str, str], WrittenModel] = {}

    def add(self, scope: str, model: WrittenModel) -> None:
        """Take a card that stands in a definition; empty: at the top level."""
        self._found[scope, model.name.lower()] = model

    def settle(
        self, scopes: Scopes, renamed: Mapping[str, str], globals_: Scope
    ) -> tuple[dict[str, ModelCard], dict[tuple[str, str], str]]:
        """Return the cards by key, and what names mean inside definitions.

        Parameters
        ----------
        scopes : Scopes
            The definitions, settled.
        renamed : Mapping of str to str
            Keys of definitions by those they had while they were read, where they differ.
        globals_ : Scope
            The parameters that values may use.
        """
        models: dict[str, ModelCard] = {}
        local: dict[str, tuple[str, str]] = {}
        for (place, _), (name, kind, parameters, span) in self._found.items():
            scope = renamed.get(place, place)
            full = f"{scope}.{name}" if scope else name
            models[full.lower()] = ModelCard(full, kind, numbers_among(parameters, globals_), span)
            if scope:
                key = _BIN.sub("", full.lower())
                local[key] = (scope, _BIN.sub("", name.lower()))
        inside = {key: scope for key, (scope, _) in local.items()}
        names = {key: name for key, (_, name) in local.items()}
        return models, local_names({**inside, **scopes.parents}, names) if names else {}


def numbers_among(parameters: Iterable[Parameter], scope: Scope) -> dict[str, float]:
    """Return the parameters that have a number; the others mean nothing to us."""
    values = {}
    for one in parameters:
        with suppress(ElaborationError):
            values[one.name] = scope.of(one)
    return values
