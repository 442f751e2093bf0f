"""Where the keys and values of a TOML file stand.

The standard library reads TOML but forgets the places. The scanner here runs over a text that
`tomllib` has accepted, so it may trust the syntax; it knows tables, arrays of tables, dotted and
quoted keys, arrays and inline tables.
"""

from __future__ import annotations

import re
import tomllib
from dataclasses import dataclass, field
from typing import Final

from evenstage.source import SourceText, Span

#: Keys and list indices from the root of the file to a value.
KeyPath = tuple[str | int, ...]

_BLANK: Final = re.compile(r"[ \t]*")
_GAP: Final = re.compile(r"(?:[ \t\r\n]|#[^\n]*)*")
_BARE_KEY: Final = re.compile(r"[A-Za-z0-9_-]+")
_SCALAR: Final = re.compile(r"[^,\]}#\r\n]*")
_STRING: Final = re.compile(
    r'''"""(?:[^\\]|\\.)*?"{3,5}|'{3}.*?'{3,5}|"(?:[^"\\\n]|\\.)*"|'[^'\n]*[']''',
    re.DOTALL,
)

_Range = tuple[int, int]


@dataclass(frozen=True)
class TomlPlaces:
    """The places of all keys and values of one file.

    Parameters
    ----------
    source : SourceText
        The file; valid TOML in UTF-8.
    """

    source: SourceText
    _found: tuple[dict[KeyPath, _Range], dict[KeyPath, _Range]] = field(init=False, repr=False)

    def __post_init__(self) -> None:
        scanner = _Scanner(self.source.data.decode())
        scanner.document()
        object.__setattr__(self, "_found", (scanner.keys, scanner.values))

    def key(self, path: KeyPath) -> Span:
        """Return the place of a key, of a table's header, or of what encloses an unknown one."""
        return self._span(self._found[0], path)

    def value(self, path: KeyPath) -> Span:
        """Return the place of a value (of a string: between its quotes), else that of its key."""
        values = self._found[1]
        return self._span(values, path) if path in values else self.key(path)

    def _span(self, ranges: dict[KeyPath, _Range], path: KeyPath) -> Span:
        while path and path not in ranges:
            path = path[:-1]
        text = self.source.data.decode()
        start, end = ranges.get(path, (0, 0))
        before = len(text[:start].encode())
        return Span(self.source, before, before + len(text[start:end].encode()))


class _Scanner:
    """Walks over TOML text once and notes character ranges by path."""

    def __init__(self, text: str) -> None:
        self.text = text
        self.at = len(text) - len(text.removeprefix("\ufeff"))
        self.keys: dict[KeyPath, _Range] = {}
        self.values: dict[KeyPath, _Range] = {}
        self._lengths: dict[KeyPath, int] = {}

    def document(self) -> None:
        """Expression, newline, expression, newline ..."""
        table: KeyPath = ()
        self._skip(_GAP)
        while self.at < len(self.text):
            if self._sees("["):
                table = self._header()
            else:
                self._pair(table)
            self._skip(_GAP)

    def _header(self) -> KeyPath:
        """``[a.b]`` or ``[[a.b]]``."""
        start = self.at
        repeated = self.text.startswith("[[", self.at)
        self.at += 2 if repeated else 1
        names, _ = self._dotted_key()
        self.at += 2 if repeated else 1
        path = self._resolved(names[:-1]) + names[-1:]
        if repeated:
            self.keys.setdefault(path, (start, self.at))
            self._lengths[path] = self._lengths.get(path, 0) + 1
        path = self._current(path)
        self.keys[path] = (start, self.at)
        return path

    def _resolved(self, names: tuple[str, ...]) -> KeyPath:
        """Return a path of names with the index of the latest entry of each array of tables."""
        path: KeyPath = ()
        for name in names:
            path = self._current((*path, name))
        return path

    def _current(self, path: KeyPath) -> KeyPath:
        return (*path, self._lengths[path] - 1) if path in self._lengths else path

    def _pair(self, table: KeyPath) -> None:
        """``a.b = value``."""
        names, place = self._dotted_key()
        path = table
        for name in names:
            path = (*path, name)
            self.keys.setdefault(path, place)
        self.at += 1
        self._skip(_BLANK)
        self._value(path)

    def _dotted_key(self) -> tuple[tuple[str, ...], _Range]:
        self._skip(_BLANK)
        start = self.at
        names = [self._name()]
        end = self.at
        self._skip(_BLANK)
        while self._sees("."):
            self.at += 1
            self._skip(_BLANK)
            names.append(self._name())
            end = self.at
            self._skip(_BLANK)
        return tuple(names), (start, end)

    def _name(self) -> str:
        if self._sees('"') or self._sees("'"):
            return str(tomllib.loads(f"name = {self._take(_STRING)}")["name"])
        return self._take(_BARE_KEY)

    def _value(self, path: KeyPath) -> None:
        start = self.at
        if self._sees('"') or self._sees("'"):
            text = self._take(_STRING)
            quotes = 3 if text[:3] in {'"""', "'''"} else 1
            self.values[path] = (start + quotes, self.at - quotes)
            return
        if self._sees("["):
            self._array(path)
        elif self._sees("{"):
            self._inline_table(path)
        else:
            text = self._take(_SCALAR)
            self.at -= len(text) - len(text.rstrip())
        self.values[path] = (start, self.at)

    def _array(self, path: KeyPath) -> None:
        index = 0
        self.at += 1
        self._skip(_GAP)
        while not self._sees("]"):
            self._value((*path, index))
            index += 1
            self._skip(_GAP)
            if self._sees(","):
                self.at += 1
                self._skip(_GAP)
        self.at += 1

    def _inline_table(self, path: KeyPath) -> None:
        self.at += 1
        self._skip(_GAP)
        while not self._sees("}"):
            self._pair(path)
            self._skip(_GAP)
            if self._sees(","):
                self.at += 1
                self._skip(_GAP)
        self.at += 1

    def _sees(self, character: str) -> bool:
        return self.text.startswith(character, self.at)

    def _skip(self, pattern: re.Pattern[str]) -> None:
        self._take(pattern)

    def _take(self, pattern: re.Pattern[str]) -> str:
        match = pattern.match(self.text, self.at)
        assert match is not None, "tomllib accepted this text"
        self.at = match.end()
        return match.group()
