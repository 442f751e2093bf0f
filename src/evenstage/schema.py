"""What may stand at a key of a settings file: numbers, whole numbers, text, names."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Protocol

from evenstage.errors import SettingsError
from evenstage.pattern import Pattern
from evenstage.units import engineering, parse_quantity

if TYPE_CHECKING:
    from evenstage.source import Span
    from evenstage.toml_places import KeyPath, TomlPlaces


@dataclass(frozen=True, slots=True)
class Where:
    """A value's place in the file, and the name its key has in messages.

    Parameters
    ----------
    places : TomlPlaces
        Of the file.
    path : KeyPath
        Of the value.
    root_keys : frozenset of str
        The keys that belong above the first table of the file.
    """

    places: TomlPlaces
    path: KeyPath = ()
    root_keys: frozenset[str] = frozenset()

    @property
    def key(self) -> str:
        """The key as it is written, dots between its parts; list indices are left out."""
        return ".".join(step for step in self.path if isinstance(step, str))

    def child(self, step: str | int) -> Where:
        """Return the place of a key or entry inside."""
        return replace(self, path=(*self.path, step))

    def error(
        self, message: str, code: str, *, span: Span | None = None, notes: tuple[str, ...] = ()
    ) -> SettingsError:
        """Return the error of a wrong value here."""
        at = self.places.value(self.path) if span is None else span
        return SettingsError(message, code=code, span=at, notes=notes)


class Entry(Protocol):
    """What may stand at a key."""

    @property
    def required(self) -> bool:
        """Whether the key must be there."""

    @property
    def default(self) -> object:
        """The value when the key is not there."""

    def read(self, value: object, where: Where) -> object:
        """Return the checked value, or raise a SettingsError."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Number:
    """A number, or text that is one with a suffix and perhaps its unit.

    Parameters
    ----------
    unit : str
        What it is measured in, as `parse_quantity` takes it.
    above, least, most, below : float
        Bounds; the first and the last are excluded.
    word : str, optional
        Text that may stand instead and means the same as leaving the key out.
    """

    unit: str = ""
    above: float = -math.inf
    least: float = -math.inf
    most: float = math.inf
    below: float = math.inf
    word: str | None = None
    required: bool = False
    default: float | None = None

    def read(self, value: object, where: Where) -> float | None:
        """Return the number in SI units."""
        if self.word is not None and value == self.word:
            return self.default
        number = self._number(value, where)
        if not (self.above < number < self.below and self.least <= number <= self.most):
            raise where.error(
                f"{where.key} must be {self._bounds()}, got {self._shown(number)}", "out-of-range"
            )
        return number

    def _number(self, value: object, where: Where) -> float:
        try:
            if isinstance(value, str):
                return parse_quantity(value, self.unit)
            if isinstance(value, int | float) and not isinstance(value, bool):
                return _finite(value)
        except (ValueError, OverflowError) as error:
            problem = "too large a number" if isinstance(error, OverflowError) else str(error)
            raise where.error(
                f"{where.key} must be {self._wanted()}: {problem}", "bad-number"
            ) from None
        raise where.error(
            f"{where.key} must be {self._wanted()}, got {kind_of(value)}", "wrong-type"
        )

    def _wanted(self) -> str:
        wanted = f"a number in {self.unit}" if self.unit else "a number"
        return f'{wanted} or "{self.word}"' if self.word else wanted

    def _bounds(self) -> str:
        shown = [
            f"{word} {self._shown(bound)}"
            for word, bound in (
                ("above", self.above),
                ("at least", self.least),
                ("at most", self.most),
                ("below", self.below),
            )
            if math.isfinite(bound)
        ]
        return " and ".join(shown)

    def _shown(self, number: float) -> str:
        if not self.unit:
            return f"{number:g}"
        digits, _, symbol = engineering(number, self.unit).partition(" ")
        return f"{digits.rstrip('0').rstrip('.') if '.' in digits else digits} {symbol}"


@dataclass(frozen=True, slots=True, kw_only=True)
class Integer:
    """A whole number within bounds."""

    least: int = 0
    required: bool = False
    default: int | None = None

    def read(self, value: object, where: Where) -> int:
        """Return the number."""
        if not isinstance(value, int) or isinstance(value, bool):
            got = str(value) if isinstance(value, float) else kind_of(value)
            raise where.error(f"{where.key} must be a whole number, got {got}", "wrong-type")
        if value < self.least:
            raise where.error(
                f"{where.key} must be at least {self.least}, got {value}", "out-of-range"
            )
        return value


@dataclass(frozen=True, slots=True, kw_only=True)
class Text:
    """Text, perhaps one of a few words."""

    choices: tuple[str, ...] = ()
    required: bool = False
    default: str | None = None

    def read(self, value: object, where: Where) -> str:
        """Return the text."""
        if not isinstance(value, str):
            raise where.error(f"{where.key} must be text, got {kind_of(value)}", "wrong-type")
        if self.choices and value not in self.choices:
            words = " or ".join(f'"{word}"' for word in self.choices)
            raise where.error(f'{where.key} must be {words}, got "{value}"', "bad-choice")
        if not value.strip():
            raise where.error(f"{where.key} must not be empty", "empty-text")
        return value


@dataclass(frozen=True, slots=True, kw_only=True)
class Names:
    """Name patterns: one text or a list of texts; if required, at least one."""

    required: bool = False
    default: tuple[Pattern, ...] = ()

    def read(self, value: object, where: Where) -> tuple[Pattern, ...]:
        """Return the patterns with their places."""
        if isinstance(value, str):
            return (self._pattern(value, where),)
        if not isinstance(value, list):
            raise where.error(
                f"{where.key} must be a list of names, got {kind_of(value)}", "wrong-type"
            )
        if self.required and not value:
            raise where.error(f"{where.key} must name something", "empty-list")
        return tuple(self._pattern(text, where.child(i)) for i, text in enumerate(value))

    def _pattern(self, value: object, where: Where) -> Pattern:
        if not isinstance(value, str):
            raise where.error(f"{where.key} must hold names, got {kind_of(value)}", "wrong-type")
        if not value.strip():
            raise where.error(f"{where.key} must not hold an empty name", "empty-text")
        return Pattern(value, where.places.value(where.path))


def _finite(value: float) -> float:
    if not math.isfinite(float(value)):
        raise ValueError(f"{value} is not finite")
    return float(value)


def kind_of(value: object) -> str:
    """Name what a value is, for messages."""
    names = {bool: "true or false", str: "text", int: "a number", float: "a number"}
    names |= {list: "a list", dict: "a table"}
    return names.get(type(value), "a date or time")
