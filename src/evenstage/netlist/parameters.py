"""Parameters in their scopes: global ones, those of a definition, those a caller passes."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.errors import ElaborationError
from evenstage.netlist.expression import Application, FormulaError
from evenstage.netlist.values import parse_value
from evenstage.netlist.wording import nearest

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Mapping

    from evenstage.netlist.functions import Function
    from evenstage.netlist.netlist import Parameter
    from evenstage.netlist.values import Value
    from evenstage.source import Span

#: From so many parameters on, earlier ones are evaluated first, so that long chains do not nest.
_LONG = 50
_FAILURES = 20


class _UndefinedError(FormulaError):
    """A name without a value."""


class Scope:
    """The parameters visible inside one definition, evaluated when somebody asks.

    Parameters
    ----------
    defaults : iterable of Parameter
        Of the ``.subckt`` card.
    assignments : iterable of Parameter
        Of the ``.param`` cards inside; they mask everything else, later ones earlier ones.
    passed : Mapping of str to float
        What the caller gives; masks the defaults.
    outer : Scope, optional
        The global parameters.
    functions : Mapping of str to Function
        By lower-case name; the global ones count everywhere.
    """

    def __init__(
        self,
        defaults: Iterable[Parameter] = (),
        assignments: Iterable[Parameter] = (),
        passed: Mapping[str, float] | None = None,
        outer: Scope | None = None,
        functions: Mapping[str, Function] | None = None,
    ) -> None:
        self._functions = functions or {}
        self._parameters = {p.name: p for p in (*defaults, *assignments)}
        masking = {p.name for p in assignments}
        self._values = {k: v for k, v in (passed or {}).items() if k not in masking}
        self._outer = outer
        self._active: list[str] = []
        if len(self._parameters) > _LONG:
            self._evaluate_in_order()

    def _evaluate_in_order(self) -> None:
        # Each order serves the chains that run the other way; a few failures tell a wrong one.
        for names in (list(self._parameters), list(reversed(self._parameters))):
            failures = 0
            for name in names:
                try:
                    self.lookup(name)
                except (FormulaError, ElaborationError):
                    failures += 1
                if failures > _FAILURES:
                    break

    def lookup(self, name: str) -> float:
        """Return the value of a parameter by lower-case name.

        Raises
        ------
        FormulaError
            If there is none of that name.
        ElaborationError
            If its own expression has no value, or needs itself.
        """
        known = self._values.get(name)
        if known is not None:
            return known
        if isinstance(name, Application):
            return self._applied(name)
        parameter = self._parameters.get(name)
        if parameter is None:
            if self._outer is None:
                raise _UndefinedError(name)
            return self._outer.lookup(name)
        value = self._guarded(name, parameter.span, lambda: self._own(parameter))
        self._values[name] = value
        return value

    def _guarded(self, name: str, span: Span, evaluate: Callable[[], float]) -> float:
        """Evaluate something that must not need itself."""
        if name in self._active:
            loop = " -> ".join([*self._active[self._active.index(name) :], name])
            message = f"the value of '{name}' depends on itself: {loop}"
            raise ElaborationError(message, code="circular-parameter", span=span)
        self._active.append(name)
        try:
            return evaluate()
        finally:
            self._active.pop()

    def _applied(self, application: Application) -> float:
        """Return the value of a function the netlist defines."""
        if self._outer is not None:
            return self._outer.lookup(application)
        function = self._functions.get(application.name)
        if function is None:
            raise FormulaError(f"uses the unknown function '{application.name}'")
        given, taken = len(application.arguments), len(function.arguments)
        if given != taken:
            raise FormulaError(
                f"gives {given} arguments to '{application.name}', which takes {taken}"
            )
        passed = dict(zip(function.arguments, application.arguments, strict=True))
        inner = Scope(passed=passed, outer=self)
        span = function.span
        return self._guarded(
            str(application), span, lambda: inner.evaluate(function.text, lambda: span)
        )

    def _own(self, parameter: Parameter) -> float:
        # A default such as w=w takes the global parameter of the same name.
        outside = self._outer if self._is_reflexive(parameter) else None
        return (outside or self).of(parameter)

    def _is_reflexive(self, parameter: Parameter) -> bool:
        try:
            formula = parse_value(parameter.text).formula
        except FormulaError:
            return False
        return formula is not None and formula.names == {parameter.name}

    def names(self) -> set[str]:
        """Return all names visible here."""
        outer = set() if self._outer is None else self._outer.names()
        return outer | self._parameters.keys() | self._values.keys()

    def of(self, parameter: Parameter) -> float:
        """Return the number a parameter's value stands for; see ``evaluate``."""
        return self.evaluate(parameter.text, lambda: parameter.span)

    def evaluate(self, text: str, where: Callable[[], Span]) -> float:
        """Return the number a value's text stands for.

        Parameters
        ----------
        text : str
            As on the card.
        where : callable
            Gives the bytes of the value, for messages.

        Raises
        ------
        ElaborationError
            If it has no value.
        """
        try:
            value = parse_value(text)
        except FormulaError as error:
            raise bad_value(text, error, where()) from None
        return self.number(value, text, where)

    def number(self, value: Value, text: str, where: Callable[[], Span]) -> float:
        """Return the number a parsed value stands for; see ``evaluate``."""
        if value.formula is None:
            return value.number
        try:
            return value.formula.value(self.lookup)
        except _UndefinedError as error:
            name = str(error)
            hint = nearest(name, self.names())
            message = f"the parameter '{name}' is not defined{hint}"
            raise ElaborationError(message, code="undefined-parameter", span=where()) from None
        except FormulaError as error:
            raise bad_value(text, error, where()) from None


def bad_value(text: str, error: FormulaError, span: Span) -> ElaborationError:
    """Return the error for a value that cannot be read or evaluated."""
    if text[:1].isdigit() or text[:1] in "+-.":
        message = f"expected a number, a parameter or an expression, got '{text}'"
        return ElaborationError(message, code="bad-number", span=span)
    return ElaborationError(f"the expression {text} {error}", code="bad-expression", span=span)
