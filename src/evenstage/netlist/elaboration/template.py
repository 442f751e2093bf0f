"""Definitions with their parameters bound: what one instance of them holds, and whom it calls."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import partial
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import ElaborationError
from evenstage.netlist.elaboration.columns import Column, absent, value_span
from evenstage.netlist.elaboration.mistakes import Mistakes
from evenstage.netlist.expression import FormulaError
from evenstage.netlist.values import plain_value
from evenstage.netlist.wording import counted

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping

    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.netlist.elaboration.flatten import Indices
    from evenstage.netlist.elaboration.library import Library
    from evenstage.netlist.elaboration.outline import Call, Outline
    from evenstage.netlist.elaboration.rows import Rows
    from evenstage.netlist.netlist import Netlist
    from evenstage.netlist.parameters import Scope
    from evenstage.source import Span

#: A definition and the values its caller gives it.
Key = tuple[str, tuple[tuple[str, float], ...]]
#: What calls have in common that need the same template: the definition, the number of nets, and
#: the identity of what they pass.
CallForm = tuple[str, int, int]


@dataclass(frozen=True, slots=True, kw_only=True)
class Template:
    """One definition with given parameters.

    Parameters
    ----------
    outline : Outline
        The definition.
    card, model : IntArray, shape (n,)
        Card number and model index of each transistor.
    nets : IntArray, shape (4, n)
        Local nets: drain, gate, source, bulk.
    columns : Mapping of str to Column
        Transistor parameters, all of them numbers.
    multiplier : FloatArray, shape (n,)
        Copies a caller adds to those its own parameters say.
    capacitance : FloatArray, F, shape (k,)
        Of each C card of the outline.
    resistance : FloatArray, ohm, shape (r,)
        Of each R card of the outline.
    callee : tuple of Key
        The template of each call that is an instance.
    calls : tuple of Call
        Those calls.
    call_multiplier : FloatArray, shape (c,)
        Their multipliers.
    """

    outline: Outline
    card: IntArray
    model: IntArray
    nets: IntArray
    columns: Mapping[str, Column]
    multiplier: FloatArray
    capacitance: FloatArray
    resistance: FloatArray
    callees: tuple[Key, ...]
    calls: tuple[Call, ...]
    call_multiplier: FloatArray


class Binder:
    """Binds definitions to parameters.

    Parameters
    ----------
    library : Library
        The outlines, the models and the global parameters.
    """

    def __init__(self, library: Library) -> None:
        self._library = library
        self._netlist: Netlist = library.netlist

    def bind(self, key: Key) -> Template:
        """Return the template of a key.

        Parameters without a value and calls that do not fit their definition are left out of it,
        and are mistakes of the library.
        """
        outline = self._library.outline(key[0])
        scope = self._library.scope(key)
        plain = self._own(outline, scope)
        instances: list[tuple[Call, Key, float]] = []
        wrapped: list[_Devices] = []
        alike: dict[CallForm, tuple[Key, float]] = {}
        shared = self._library.alike
        for call in outline.calls:
            if call.target not in self._netlist.subcircuits:
                continue  # a mistake that was noticed before
            form = (call.target, len(call.nets), id(call.parameters))
            known = shared.get(form) or alike.get(form)
            if known is not None:
                instances.append((call, *known))
                continue
            with self._library.mistakes.collecting():
                callee = self._key(call, scope)
                multiplier = self._multiplier(call, scope)
                device = self._wrapped(call, callee, multiplier)
                if device is None:
                    everywhere = all(map(_is_number, call.parameters.values()))
                    (shared if everywhere else alike)[form] = callee, multiplier
                    instances.append((call, callee, multiplier))
                else:
                    wrapped.append(device)
        devices = _merged(plain, wrapped) if wrapped else plain
        return Template(
            outline=outline,
            card=devices.card,
            model=devices.model,
            nets=devices.nets,
            columns=devices.columns,
            multiplier=devices.multiplier,
            capacitance=np.multiply(*self._values(outline.capacitors, "c", scope)),
            resistance=self._resistance(outline.resistors, scope),
            callees=tuple(callee for _, callee, _ in instances),
            calls=tuple(call for call, _, _ in instances),
            call_multiplier=np.array([m for *_, m in instances], np.float64),
        )

    def _own(self, outline: Outline, scope: Scope) -> _Devices:
        """Return the transistors of an outline with their parameters evaluated."""
        rows = outline.transistors
        wrapper = outline.subcircuit.name if self._library.is_wrapper(outline) else ""
        models = np.zeros(len(rows.target_names), np.int32)
        for i, name in enumerate(rows.target_names):
            with self._library.mistakes.collecting():
                card = int(rows.card[np.argmax(rows.target == i)])
                models[i] = self._library.models.index(name, card, wrapper)
        return _Devices(
            card=rows.card,
            model=models[rows.target] if len(rows) else np.zeros(0, np.int32),
            nets=rows.nets,
            columns=self._bound(rows, scope),
            multiplier=np.ones(len(rows)),
        )

    def _bound(self, rows: Rows, scope: Scope) -> dict[str, Column]:
        bound = {}
        for name, column in rows.columns.items():
            bound[name] = column
            with self._library.mistakes.collecting():
                bound[name] = column.bound(scope, partial(self._span, rows, name))
        return bound

    def _span(self, rows: Rows, name: str, row: int) -> Span:
        return value_span(self._netlist, int(rows.card[row]), name)

    def _resistance(self, rows: Rows, scope: Scope) -> FloatArray:
        """Return the resistance of each R card; NaN where it has none."""
        value, copies = self._values(rows, "r", scope)
        return np.divide(value, copies, out=np.full_like(value, np.nan), where=copies > 0)

    def _values(self, rows: Rows, name: str, scope: Scope) -> tuple[FloatArray, FloatArray]:
        """Return value and copies of each C or R card; the value NaN where it has none."""
        unnamed_column = rows.columns.get("", absent(len(rows)))
        known = tuple(f for f in unnamed_column.formulas if not _is_model(f[1], scope))
        columns = {**rows.columns, "": replace(unnamed_column, formulas=known)}
        columns = self._bound(replace(rows, columns=columns), scope)
        empty = absent(len(rows))
        unnamed, named = (columns.get(key, empty).numbers for key in ("", name))
        copies = columns.get("m", empty).numbers
        return np.where(np.isnan(named), unnamed, named), np.where(np.isnan(copies), 1.0, copies)

    # Calls.

    def _key(self, call: Call, scope: Scope) -> Key:
        """Return which template a call needs."""
        callee = self._library.outline(call.target)
        self._check_pins(call, callee)
        passed = []
        mistakes = Mistakes()
        for name in sorted(callee.names_used & call.parameters.keys()):
            with mistakes.collecting():
                passed.append((name, self._evaluated(call, name, scope)))
        mistakes.check()
        return call.target, tuple(passed)

    def _evaluated(self, call: Call, name: str, scope: Scope) -> float:
        text = call.parameters[name]
        return scope.evaluate(text, lambda: value_span(self._netlist, call.card, name))

    def _multiplier(self, call: Call, scope: Scope) -> float:
        """Return how many copies a call stands for; an ``m`` the callee uses is its own affair."""
        callee = self._library.outline(call.target)
        own = "m" in callee.subcircuit.default_names & callee.names_used
        if "m" not in call.parameters or own:
            return 1.0
        multiplier = self._evaluated(call, "m", scope)
        if multiplier <= 0:
            message = f"a multiplier must be positive, got '{call.parameters['m']}'"
            span = value_span(self._netlist, call.card, "m")
            raise ElaborationError(message, code="bad-multiplier", span=span)
        return multiplier

    def _check_pins(self, call: Call, callee: Outline) -> None:
        if len(call.nets) == callee.ports:
            return
        card = self._netlist.card(call.card)
        subcircuit = callee.subcircuit
        assert subcircuit.header is not None
        ports, nets = counted(callee.ports, "port"), counted(len(call.nets), "net")
        message = f"'{subcircuit.name}' has {ports}, but '{card.name}' gives {nets}"
        note = f"'{subcircuit.name}' begins at {subcircuit.header.place}"
        raise ElaborationError(message, code="pin-count", span=card.span, notes=(note,))

    def _wrapped(self, call: Call, callee: Key, multiplier: float) -> _Devices | None:
        """Return the transistor a call stands for if it is a wrapper's and gives its width."""
        outline = self._library.outline(call.target)
        widths = self._library.width_parameters
        if not self._library.is_wrapper(outline) or widths.isdisjoint(call.parameters):
            return None
        inner = self._library.template(callee)
        if len(inner.card) != 1 or not self._gives_width(call, inner):
            return None
        if inner.nets.max() >= outline.ports:
            # A net of its own, or a global one, makes it more than a transistor drawn as a call.
            return None
        nets = np.array(call.nets, np.int32)[inner.nets]
        return _Devices(
            card=np.array([call.card], np.int32),
            model=inner.model,
            nets=nets,
            columns=inner.columns,
            multiplier=inner.multiplier * multiplier,
        )

    def _gives_width(self, call: Call, inner: Template) -> bool:
        model = self._library.models.models[int(inner.model[0])]
        name = self._library.process.transistors[model.type_index].width_parameter
        return name in call.parameters and name in inner.outline.names_used


@dataclass(frozen=True, slots=True, kw_only=True)
class _Devices:
    """Transistors of one template; see there."""

    card: IntArray
    model: IntArray
    nets: IntArray
    columns: Mapping[str, Column]
    multiplier: FloatArray


def _is_number(text: str) -> bool:
    """Tell whether a text means the same in every definition."""
    try:
        return plain_value(text) is not None
    except FormulaError:
        return False


def _is_model(text: str, scope: Scope) -> bool:
    """Tell whether the word where a C or R card's value stands is no parameter, so its model."""
    return text.isidentifier() and text not in scope.names()


def _merged(plain: _Devices, wrapped: list[_Devices]) -> _Devices:
    """Return all transistors in the order of their cards."""
    parts = [plain, *wrapped]
    order = np.argsort(np.concatenate([part.card for part in parts]), kind="stable")

    def joined(arrays: Iterable[IntArray]) -> IntArray:
        return np.concatenate(list(arrays), axis=-1)[..., order]

    names = dict.fromkeys(name for part in parts for name in part.columns)
    return _Devices(
        card=joined(part.card for part in parts),
        model=joined(part.model for part in parts),
        nets=joined(part.nets for part in parts),
        columns={name: column_of(parts, name, order) for name in names},
        multiplier=np.concatenate([part.multiplier for part in parts])[order],
    )


def column_of(parts: Iterable[_Devices | Template], name: str, order: Indices | slice) -> Column:
    """Return one parameter of several parts in one column."""
    columns = [part.columns.get(name) or absent(len(part.card)) for part in parts]
    if len(columns) == 1 and order == slice(None):
        return columns[0]
    return Column(
        np.concatenate([column.numbers for column in columns])[order],
        np.concatenate([column.styles for column in columns])[order],
    )
