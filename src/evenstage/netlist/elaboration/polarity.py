"""Which transistor type of the process a model name stands for."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

from evenstage.errors import ElaborationError, Notice
from evenstage.netlist.devices import Model
from evenstage.netlist.wording import listed

if TYPE_CHECKING:
    from evenstage.netlist.netlist import Netlist
    from evenstage.process.process import Polarity, Process

_BY_KIND: dict[str, Polarity] = {"nmos": "n", "pmos": "p"}
_BY_NAME: tuple[tuple[Polarity, re.Pattern[str]], ...] = (
    ("n", re.compile(r"nmos|nfet|nch|\An")),
    ("p", re.compile(r"pmos|pfet|pch|\Ap")),
)
_BY_BULK: tuple[tuple[Polarity, re.Pattern[str]], ...] = (
    ("n", re.compile(r"\A(?:v?ss|gnd|vgnd|vnb|vpw|sub|0)(?:\W|\d|_|\Z)")),
    ("p", re.compile(r"\A(?:v?dd|vcc|vpwr|vpb|vnw|sup)(?:\W|\d|_|\Z)")),
)


class Models:
    """The models met while elaborating, each looked up once.

    Parameters
    ----------
    netlist : Netlist
        Holds the ``.model`` cards.
    process : Process
        Holds the transistor types.
    """

    def __init__(self, netlist: Netlist, process: Process) -> None:
        self._netlist = netlist
        self._process = process
        self._indices: dict[str, int] = {}
        self._models: list[Model] = []
        self._assumed: dict[str, list[str]] = {}

    @property
    def models(self) -> tuple[Model, ...]:
        """All models met."""
        return tuple(self._models)

    def index(self, key: str, card: int, wrapper: str = "") -> int:
        """Return the index of a model.

        Parameters
        ----------
        key : str
            Its lower-case name.
        card : int
            A card that names it.
        wrapper : str
            A subcircuit around it, whose name the process may know instead.

        Raises
        ------
        ElaborationError
            If nothing says whether it is n or p.
        """
        meant = self._netlist.model_key(self._netlist.cards.scope(card), key)
        known = self._indices.get(meant)
        if known is None:
            known = self._indices[meant] = len(self._models)
            # In the place of a model nobody knows another stands, so that it is told once.
            self._models.append(Model(key, self._process.transistors[0].polarity, 0))
            self._models[known] = self._model(key, meant, card, wrapper)
        return known

    def _model(self, key: str, meant: str, number: int, wrapper: str) -> Model:
        card = self._netlist.card(number)
        name = card.target if card.target.lower() == key else key
        # A process file covers names as cards say them, an inferred process model cards.
        own = name if meant == key or self._process.origin == "file" else meant
        covered = (self._process.type_of(alias) for alias in (own, wrapper) if alias)
        type_index = next((index for index in covered if index is not None), None)
        if type_index is not None:
            return Model(name, self._process.transistors[type_index].polarity, type_index)
        polarity, reason = self._second_opinion(key, meant, card.nodes[3].lower())
        if polarity is None:
            message = (
                f"no transistor type covers the model '{name}', and nothing says whether it is "
                "n or p; add it to the process file"
            )
            raise ElaborationError(message, code="unknown-model", span=card.target_span)
        self._assumed.setdefault(f"{polarity}-channel by {reason}", []).append(name)
        first = self._process.first(polarity)
        return Model(name, polarity, self._process.transistors.index(first))

    def _second_opinion(self, key: str, meant: str, bulk: str) -> tuple[Polarity | None, str]:
        model = self._netlist.models.get(meant)
        if model is not None and model.kind.lower() in _BY_KIND:
            return _BY_KIND[model.kind.lower()], "its .model card"
        for text, patterns, reason in (
            (key, _BY_NAME, "its name"),
            (bulk, _BY_BULK, "its bulk net"),
        ):
            fitting = [polarity for polarity, pattern in patterns if pattern.search(text)]
            if len(fitting) == 1:
                return fitting[0], reason
        return None, ""

    def notices(self) -> list[Notice]:
        """Return what was assumed."""
        return [
            Notice(
                "type-assumed",
                f"no transistor type covers {listed(names)}; taken as {what}",
                names=tuple(names),
            )
            for what, names in self._assumed.items()
        ]
