"""Process files and briefs: TOML read against a schema.

A schema is data: a mapping of keys to what may stand there. Reading checks everything once and
fills in the defaults, so that whoever asks for a value afterwards gets one of the right type.
"""

from __future__ import annotations

import difflib
import re
import tomllib
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Final

from evenstage.errors import SettingsError
from evenstage.schema import Entry, Where, kind_of
from evenstage.source import SourceText, Span
from evenstage.toml_places import TomlPlaces

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.pattern import Pattern

#: Share of letters that two keys must have alike before one is taken for the other.
_ALIKE: Final = 0.5
_SYNTAX_PLACE: Final = re.compile(r" \(at (?:line (\d+), column (\d+)|end of document)\)$")


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """A table with keys of its own; left out, it is one without any keys."""

    keys: Mapping[str, Entry]
    required: bool = False
    default: None = None

    def read(self, value: object, where: Where) -> Settings:
        """Return the checked table."""
        if not isinstance(value, dict):
            raise where.error(f"{where.key} must be a table, got {kind_of(value)}", "wrong-type")
        return _read_table(value, self.keys, where)


@dataclass(frozen=True, slots=True, kw_only=True)
class Tables:
    """A list of tables, each written under ``[[its name]]``; if required, at least one."""

    keys: Mapping[str, Entry]
    required: bool = False
    default: tuple[Settings, ...] = ()

    def read(self, value: object, where: Where) -> tuple[Settings, ...]:
        """Return the checked tables."""
        if not isinstance(value, list) or not all(isinstance(entry, dict) for entry in value):
            raise where.error(
                f"{where.key} must be tables, each under [[{where.key}]], got {kind_of(value)}",
                "wrong-type",
                span=where.places.key(where.path),
            )
        return tuple(_read_table(entry, self.keys, where.child(i)) for i, entry in enumerate(value))


@dataclass(frozen=True, slots=True)
class Settings:
    """One checked table of a file; the accessors name the type the schema has promised.

    Asking for a key the schema does not have, or for another type, is a fault of the program.
    """

    where: Where
    _values: Mapping[str, object] = field(repr=False)

    def number(self, key: str) -> float:
        """Return a number that the schema requires or gives a default."""
        value = self._values[key]
        assert isinstance(value, float)
        return value

    def optional_number(self, key: str) -> float | None:
        """Return a number, or None where the file gives none."""
        return None if self._values[key] is None else self.number(key)

    def integer(self, key: str) -> int:
        """Return a whole number that the schema requires or gives a default."""
        value = self._values[key]
        assert isinstance(value, int)
        return value

    def text(self, key: str) -> str:
        """Return a text that the schema requires or gives a default."""
        value = self._values[key]
        assert isinstance(value, str)
        return value

    def optional_text(self, key: str) -> str | None:
        """Return a text, or None where the file gives none."""
        return None if self._values[key] is None else self.text(key)

    def names(self, key: str) -> tuple[Pattern, ...]:
        """Return the patterns, none where the file gives none."""
        value = self._values[key]
        assert isinstance(value, tuple)
        return value

    def table(self, key: str) -> Settings:
        """Return a table inside."""
        value = self._values[key]
        assert isinstance(value, Settings)
        return value

    def tables(self, key: str) -> tuple[Settings, ...]:
        """Return the tables of a list, none where the file gives none."""
        value = self._values[key]
        assert isinstance(value, tuple)
        return value

    def error(self, key: str, message: str, code: str) -> SettingsError:
        """Return the error of a value that does not fit the others."""
        return self.where.child(key).error(message, code)

    def header_error(self, message: str, code: str) -> SettingsError:
        """Return the error of a table as a whole."""
        return self.where.error(message, code, span=self.where.places.key(self.where.path))

    def check_order(self, lower: str, upper: str) -> None:
        """Raise a SettingsError if a lower limit, where given, is above the upper one."""
        least, most = self.optional_number(lower), self.optional_number(upper)
        if least is not None and most is not None and least > most:
            raise self.error(upper, f"{upper} is below {lower}", "limits-crossed")


def read_settings(path: str | Path, keys: Mapping[str, Entry]) -> Settings:
    """Read a TOML file and check it against a schema.

    Parameters
    ----------
    path : str or Path
        The file, as the user wrote it.
    keys : Mapping of str to Entry
        The schema of its root table.

    Raises
    ------
    SettingsError
        If the file cannot be read, is not TOML, or does not fit the schema.
    """
    source = _read_source(path)
    values, places = _parse(source)
    return _read_table(values, keys, Where(places, root_keys=frozenset(keys)))


def _read_source(path: str | Path) -> SourceText:
    try:
        data = Path(path).read_bytes()
    except FileNotFoundError:
        raise SettingsError(f"there is no file '{path}'", code="missing-file") from None
    except OSError as error:
        reason = (error.strerror or str(error)).lower()
        raise SettingsError(f"cannot read '{path}': {reason}", code="unreadable-file") from None
    except ValueError:
        raise SettingsError(f"cannot read {str(path)!r}", code="unreadable-file") from None
    source = SourceText(Path(path).resolve(), data, str(path))
    try:
        data.decode()
    except UnicodeDecodeError as error:
        raise SettingsError(
            "this byte is not UTF-8; save the file as UTF-8 text",
            code="not-utf-8",
            span=Span(source, error.start, error.start + 1),
        ) from None
    return source


def _parse(source: SourceText) -> tuple[dict[str, object], TomlPlaces]:
    text = source.data.decode()
    try:
        # A byte-order mark is no TOML but harmless; a blank keeps all columns.
        values = tomllib.loads(text.replace("\ufeff", " ", 1) if text[:1] == "\ufeff" else text)
        return values, TomlPlaces(source)
    except RecursionError:
        raise SettingsError(
            "brackets are nested too deeply", code="bad-toml", span=Span(source, 0, 0)
        ) from None
    except ValueError as error:
        raise _syntax_error(source, str(error)) from None


def _syntax_error(source: SourceText, message: str) -> SettingsError:
    """Turn the library's message, which ends in line and column, into one with a span."""
    place = _SYNTAX_PLACE.search(message)
    problem = _SYNTAX_PLACE.sub("", message)
    at = len(source.data.rstrip())
    if place is not None and place[1] is not None:
        lines = source.data.decode().split("\n")
        row, column = int(place[1]) - 1, int(place[2]) - 1
        at = len("\n".join([*lines[:row], lines[row][:column]]).encode())
    return SettingsError(
        f"not valid TOML: {problem[:1].lower()}{problem[1:]}",
        code="bad-toml",
        span=Span(source, at, at),
    )


def _read_table(values: Mapping[str, object], keys: Mapping[str, Entry], where: Where) -> Settings:
    for key in values:
        if key not in keys:
            raise _unknown_key(where.child(key), keys)
    checked = {key: _read_entry(values, key, entry, where) for key, entry in keys.items()}
    return Settings(where, checked)


def _read_entry(values: Mapping[str, object], key: str, entry: Entry, where: Where) -> object:
    if key in values:
        return entry.read(values[key], where.child(key))
    if entry.required:
        owner = f" in [[{where.key}]]" if where.path else ""
        raise where.error(
            f"{key} is missing{owner}", "missing-key", span=where.places.key(where.path)
        )
    if isinstance(entry, Table):
        return _read_table({}, entry.keys, where.child(key))
    return entry.default


def _unknown_key(where: Where, keys: Mapping[str, Entry]) -> SettingsError:
    unknown = str(where.path[-1])
    advice = "it belongs above the first table of the file"
    if unknown not in where.root_keys:
        nearest = difflib.get_close_matches(unknown.lower(), keys, n=1, cutoff=_ALIKE)
        advice = (
            f"the nearest known one is {nearest[0]}"
            if nearest
            else "no known one is like it: is this the right kind of file?"
        )
    return where.error(
        f"unknown key {where.key}; {advice}",
        "unknown-key",
        span=where.places.key(where.path),
        notes=(f"known here: {', '.join(keys)}",),
    )
