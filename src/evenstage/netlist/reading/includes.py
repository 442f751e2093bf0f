"""Files that a netlist includes: where they are, and sections of library files.

A file is looked for beside the file that includes it, under the name that one goes by; where that
is a link and nothing is found, beside the file the link stands for. Links, symbolic and hard, stand
for one file, which is read once.
"""

from __future__ import annotations

import os
import re
from contextlib import contextmanager, suppress
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
        self._folders: list[Path] = []
        self._files: dict[tuple[int, int], Path] = {}
        #: The names each file goes by, by its path.
        self.names: dict[Path, tuple[Path, ...]] = {}
        #: Paths of the files that some card includes by a name from the root.
        self.rooted: set[Path] = set()

    @property
    def sources(self) -> tuple[SourceText, ...]:
        """The files, the main one first."""
        return tuple(self._sources.values())

    def add(self, source: SourceText, name: Path) -> None:
        """Take the main file, and where it was asked for."""
        self._sources[source.path] = source
        self.names[source.path] = (name,)
        with suppress(OSError, ValueError):
            self._same_file(source.path)

    def find(self, name: Span) -> SourceText:
        """Return the file an ``.include`` or ``.lib`` card names, relative to the card's file.

        Raises
        ------
        NetlistError
            If it cannot be read.
        """
        written = _written(name)
        label = os.path.normpath(Path(name.source.label).parent / written)
        try:
            path = self._same_file(self._real_path(name, written))
            if path in self._sources:
                return self._named(path, written)
            data = read_file(path)
        except FileNotFoundError:
            message = f"there is no file '{label}' to include"
            raise NetlistError(message, code="missing-file", span=name) from None
        except (OSError, ValueError) as error:
            message = f"cannot read '{label}': {why_not(error)}"
            raise NetlistError(message, code="unreadable-file", span=name) from None
        self._sources[path] = SourceText(path, data, label)
        return self._named(path, written)

    def _real_path(self, name: Span, written: str) -> Path:
        """Return where a file really is, all symbolic links followed."""
        beside = self._name(written)
        if not beside.exists():
            beside = name.source.path.parent / written
        return Path(os.path.realpath(beside))

    def _name(self, written: str) -> Path:
        """Return the name a card gives to a file, links in it left as they are."""
        return Path(os.path.normpath(self._folders[-1] / written))

    def _same_file(self, path: Path) -> Path:
        """Return the path under which a file is known, another hard link to it perhaps."""
        status = path.stat()
        if not status.st_ino:  # a file system that tells files apart by their names alone
            return path
        return self._files.setdefault((status.st_dev, status.st_ino), path)

    def _named(self, path: Path, written: str) -> SourceText:
        """Take note of a name of a file and return the file."""
        if Path(written).is_absolute():
            self.rooted.add(path)
        self.names[path] = tuple(dict.fromkeys((*self.names.get(path, ()), self._name(written))))
        return self._sources[path]

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
        named = self.names[source.path][0] if name is None else self._name(_written(name))
        self._chain.append(key)
        self._folders.append(named.parent)
        yield
        self._chain.pop()
        self._folders.pop()


def _written(name: Span) -> str:
    return name.text.strip(_QUOTES)


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
