"""Files that a netlist includes: where they are, and sections of library files."""

from __future__ import annotations

import os
import re
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Final, TypeVar

from evenstage.errors import NetlistError
from evenstage.netlist.reading.files import read_file, why_not
from evenstage.source import SourceText, Span

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

_QUOTES: Final = "'\""
_DEPTH: Final = 100
_B = rb"[\x00-\x09\x0b-\x20]"
_SECTION = re.compile(rb"(?m)^" + _B + rb"*\.lib" + _B + rb"+([^\x00-\x20]+)" + _B + rb"*$")
_END_OF_SECTION = re.compile(rb"(?m)^" + _B + rb"*\.endl(?![^\x00-\x20])[^\n]*")

_Unit = TypeVar("_Unit")


class Includes:
    """All files of a netlist, each read once, and the chain of those being read."""

    def __init__(self) -> None:
        self._sources: dict[Path, SourceText] = {}
        self._units: dict[Path, object] = {}
        self._chain: list[tuple[Path, str]] = []

    @property
    def sources(self) -> tuple[SourceText, ...]:
        """The files, the main one first."""
        return tuple(self._sources.values())

    def add(self, source: SourceText) -> None:
        """Take the main file."""
        self._sources[source.path] = source

    def find(self, name: Span) -> SourceText:
        """Return the file an ``.include`` or ``.lib`` card names, relative to the card's file.

        Raises
        ------
        NetlistError
            If it cannot be read.
        """
        written = name.text.strip(_QUOTES)
        path = self._real_path(name, written)
        known = self._sources.get(path)
        if known is not None:
            return known
        label = os.path.normpath(Path(name.source.label).parent / written)
        try:
            data = read_file(path)
        except FileNotFoundError:
            message = f"there is no file '{label}' to include"
            raise NetlistError(message, code="missing-file", span=name) from None
        except (OSError, ValueError) as error:
            message = f"cannot read '{label}': {why_not(error)}"
            raise NetlistError(message, code="unreadable-file", span=name) from None
        self._sources[path] = SourceText(path, data, label)
        return self._sources[path]

    def _real_path(self, name: Span, written: str) -> Path:
        """Return where a file really is, so that all its names stand for one file."""
        try:
            return Path(os.path.realpath(name.source.path.parent / written))
        except ValueError:
            message = f"cannot read '{written}': not a file name"
            raise NetlistError(message, code="unreadable-file", span=name) from None

    def unit(self, source: SourceText, make: Callable[[SourceText], _Unit]) -> _Unit:
        """Return what was made of a file, made once."""
        if source.path not in self._units:
            self._units[source.path] = make(source)
        return self._units[source.path]  # type: ignore[return-value]  # one maker for all

    @contextmanager
    def entered(
        self, source: SourceText, section: Span | None, name: Span | None
    ) -> Iterator[None]:
        """Be inside a file, or a section of it.

        Raises
        ------
        NetlistError
            If that file or section is being read already, or too many are.
        """
        key = (source.path, "" if section is None else section.text.strip(_QUOTES).lower())
        if key in self._chain:
            files = [self._sources[path].label for path, _ in self._chain]
            loop = " -> ".join([*files[self._chain.index(key) :], source.label])
            message = f"this file is being read already: {loop}"
            raise NetlistError(message, code="include-cycle", span=name)
        if len(self._chain) > _DEPTH:
            message = f"files are included more than {_DEPTH} deep"
            raise NetlistError(message, code="include-cycle", span=name)
        self._chain.append(key)
        yield
        self._chain.pop()


def section_range(source: SourceText, text: bytes, name: Span, *, wanted: bool = False) -> range:
    """Return the bytes of a library section between its ``.lib`` and ``.endl`` cards.

    Parameters
    ----------
    source : SourceText
        The library file.
    text : bytes
        Its canonical text.
    name : Span
        The section's name: on its own ``.lib`` card, or on the card that wants it.
    wanted : bool
        True if another card wants the section: then it is looked for.

    Returns
    -------
    range
        Of the section's cards; for a section not wanted, up to the end of its ``.endl`` card.

    Raises
    ------
    NetlistError
        If there is no such section, or no ``.endl`` closes it.
    """
    start, span = _find_section(source, text, name) if wanted else (name.end, name)
    end = _END_OF_SECTION.search(text, start)
    if end is None:
        message = f"no '.endl' closes the section '{span.text}'"
        raise NetlistError(message, code="unmatched-lib", span=span)
    return range(start, end.start() if wanted else end.end())


def _find_section(source: SourceText, text: bytes, name: Span) -> tuple[int, Span]:
    written = name.text.strip(_QUOTES)
    for match in _SECTION.finditer(text):
        span = Span(source, *match.span(1))
        if span.text.strip(_QUOTES).lower() == written.lower():
            return match.end(), span
    known = [Span(source, *m.span(1)).text.strip(_QUOTES) for m in _SECTION.finditer(text)]
    has = f"it has {', '.join(known)}" if known else "it has none"
    message = f"'{source.label}' has no section '{written}'; {has}"
    raise NetlistError(message, code="missing-section", span=name)
