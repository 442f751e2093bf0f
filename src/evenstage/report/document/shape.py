"""How values become JSON and JSON becomes the same values again: one table for both ways."""

from __future__ import annotations

from dataclasses import MISSING, dataclass, fields, is_dataclass
from typing import TYPE_CHECKING, Any, Final, Generic, Protocol, TypeAlias, TypeVar

from evenstage.errors import DocumentError

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping, Sequence

JsonValue: TypeAlias = (
    "bool | int | float | str | Sequence[JsonValue] | Mapping[str, JsonValue] | None"
)
Document: TypeAlias = dict[str, JsonValue]

T = TypeVar("T")


@dataclass(frozen=True, slots=True)
class Kind:
    """A kind of value.

    Parameters
    ----------
    write : callable
        Value to JSON.
    read : callable
        JSON, and the place it stands at for messages, to value.
    """

    write: Callable[[Any], JsonValue]
    read: Callable[[Any, str], Any]


class Entry(Protocol):
    """A part of a document that holds one field of a dataclass, or some."""

    @property
    def fields(self) -> tuple[str, ...]:
        """Names of the fields held."""

    def write(self, value: object) -> Document:
        """Return the keys of a value."""

    def read(self, document: Mapping[str, object], place: str) -> dict[str, Any]:
        """Return the fields by name; a key that is missing leaves its field out.

        Raises
        ------
        DocumentError
            Where a key holds something else; it names the place.
        """


@dataclass(frozen=True, slots=True)
class Field:
    """A key that holds a field, as a value of some kind."""

    key: str
    name: str
    kind: Kind

    @property
    def fields(self) -> tuple[str, ...]:
        """The one name."""
        return (self.name,)

    def write(self, value: object) -> Document:
        """Return the key."""
        return {self.key: self.kind.write(getattr(value, self.name))}

    def read(self, document: Mapping[str, object], place: str) -> dict[str, Any]:
        """Return the field, if the key is there; raises as `Entry.read`."""
        if self.key not in document:
            return {}
        return {self.name: self.kind.read(document[self.key], f"{place}.{self.key}".lstrip("."))}


@dataclass(frozen=True, slots=True)
class Depending:
    """A key that holds a field whose kind depends on the other fields when it is written.

    Parameters
    ----------
    key, name : str
        As of `Field`.
    kind : callable
        The kind, of a value.
    any_kind : Kind
        What reads all of those kinds.
    """

    key: str
    name: str
    kind: Callable[[Any], Kind]
    any_kind: Kind

    @property
    def fields(self) -> tuple[str, ...]:
        """The one name."""
        return (self.name,)

    def write(self, value: object) -> Document:
        """Return the key."""
        return Field(self.key, self.name, self.kind(value)).write(value)

    def read(self, document: Mapping[str, object], place: str) -> dict[str, Any]:
        """Return the field, if the key is there; raises as `Entry.read`."""
        return Field(self.key, self.name, self.any_kind).read(document, place)


@dataclass(frozen=True, slots=True)
class Told:
    """A key that says what follows from the fields; it is not read back."""

    key: str
    told: Callable[[Any], JsonValue]
    fields: tuple[str, ...] = ()

    def write(self, value: object) -> Document:
        """Return the key."""
        return {self.key: self.told(value)}

    def read(self, document: Mapping[str, object], place: str) -> dict[str, Any]:
        """Return nothing."""
        del document, place
        return {}


@dataclass(frozen=True, slots=True)
class InUnits:
    """A number that stands at one of several keys, by its unit; the others are null.

    Parameters
    ----------
    keys : mapping
        Key by what decides the unit.
    name : str
        The field.
    unit : callable
        What decides the unit, of a value.
    """

    keys: Mapping[str, str]
    name: str
    unit: Callable[[Any], str]

    @property
    def fields(self) -> tuple[str, ...]:
        """The one name."""
        return (self.name,)

    def write(self, value: object) -> Document:
        """Return all the keys."""
        unit = self.unit(value)
        return {
            key: getattr(value, self.name) if one == unit else None
            for one, key in self.keys.items()
        }

    def read(self, document: Mapping[str, object], place: str) -> dict[str, Any]:
        """Return the number that is there; raises as `Entry.read`."""
        for key in self.keys.values():
            if document.get(key) is not None:
                return {self.name: NUMBER.read(document[key], f"{place}.{key}".lstrip("."))}
        return {}


@dataclass(frozen=True, slots=True)
class Within:
    """Fields that stand together in an object of their own."""

    key: str
    entries: tuple[Entry, ...]

    @property
    def fields(self) -> tuple[str, ...]:
        """Their names."""
        return tuple(name for entry in self.entries for name in entry.fields)

    def write(self, value: object) -> Document:
        """Return the one key."""
        inner: Document = {}
        for entry in self.entries:
            inner |= entry.write(value)
        return {self.key: inner}

    def read(self, document: Mapping[str, object], place: str) -> dict[str, Any]:
        """Return the fields that are there; raises as `Entry.read`."""
        at = f"{place}.{self.key}".lstrip(".")
        inner = an_object(document.get(self.key, {}), at)
        return {name: v for entry in self.entries for name, v in entry.read(inner, at).items()}


class Shape(Generic[T]):
    """How the values of one dataclass are written and read.

    Parameters
    ----------
    made : type
        The dataclass. Fields that no key holds have a default.
    *entries : Entry
        In the order of the document.
    """

    def __init__(self, made: type[T], *entries: Entry) -> None:
        assert is_dataclass(made)
        self._made = made
        self._entries = entries
        self._needed = {
            one.name for one in fields(made) if one.default is MISSING is one.default_factory
        }
        self.kind: Final = Kind(self.write, self.read)

    def write(self, value: T) -> Document:
        """Return a value as plain values by key."""
        document: Document = {}
        for entry in self._entries:
            document |= entry.write(value)
        return document

    def read(self, document: object, place: str = "") -> T:
        """Return the value that a document holds.

        Raises
        ------
        DocumentError
            Where a key is missing or holds something else; it names the place.
        """
        keys = an_object(document, place)
        found = {
            name: value
            for entry in self._entries
            for name, value in entry.read(keys, place).items()
        }
        for entry in self._entries:
            if not self._needed.isdisjoint(entry.fields) and not found.keys() >= set(entry.fields):
                missing = next(name for name in entry.fields if name not in found)
                where = f"'{place}'" if place else "the document"
                message = (
                    f"{where} does not say its {missing.replace('_', ' ')}; name a file that "
                    "--json of this version wrote"
                )
                raise DocumentError(message, code="not-a-document")
        return self._made(**found)


def an_object(document: object, place: str) -> dict[str, object]:
    """Return a part of a document that is an object.

    Raises
    ------
    DocumentError
        Where it is something else.
    """
    if not isinstance(document, dict):
        raise _wrong(place, "an object", document)
    return document


def a_list(value: object, place: str) -> list[object]:
    """Return a part of a document that is a list; raises as `an_object`."""
    if not isinstance(value, list):
        raise _wrong(place, "a list", value)
    return value


def _wrong(place: str, expected: str, found: object) -> DocumentError:
    shown = repr(found)
    shown = shown if len(shown) <= _SHOWN else f"{shown[:_SHOWN]}..."
    where = f"'{place}'" if place else "the document"
    message = f"{where} must be {expected}, got {shown}; name a file that --json wrote"
    return DocumentError(message, code="not-a-document")


#: Signs of a wrong value that a message shows.
_SHOWN: Final = 40


def _plain(expected: str, *types: type) -> Kind:
    """Return the kind of values that JSON knows itself; truth is no number."""

    def read(value: object, place: str) -> object:
        if not isinstance(value, types) or (isinstance(value, bool) and bool not in types):
            raise _wrong(place, expected, value)
        return value

    return Kind(lambda value: value, read)


def _real(value: object, place: str) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise _wrong(place, "a number", value)
    return float(value)


TEXT: Final = _plain("text", str)
WHOLE: Final = _plain("a whole number", int)
TRUTH: Final = _plain("true or false", bool)
NUMBER: Final = Kind(lambda value: value, _real)


def _read_level(value: object, place: str) -> bool:
    if value not in {0, 1} or isinstance(value, bool):
        raise _wrong(place, "0 or 1", value)
    return bool(value)


#: A logic value as 0 or 1.
LEVEL: Final = Kind(int, _read_level)


def optional(kind: Kind) -> Kind:
    """Return the kind of values that may be None."""
    return Kind(
        lambda value: None if value is None else kind.write(value),
        lambda value, place: None if value is None else kind.read(value, place),
    )


def many(kind: Kind) -> Kind:
    """Return the kind of tuples of values of one kind."""

    def read(value: object, place: str) -> tuple[Any, ...]:
        every = enumerate(a_list(value, place))
        return tuple(kind.read(one, f"{place}[{index}]") for index, one in every)

    return Kind(lambda values: [kind.write(value) for value in values], read)


def pairs(first: str, kind: Kind, second: str, other: Kind) -> Kind:
    """Return the kind of tuples of pairs, each written as an object of two keys."""

    def read(value: object, place: str) -> tuple[tuple[Any, Any], ...]:
        found = []
        for index, one in enumerate(a_list(value, place)):
            at = f"{place}[{index}]"
            if not isinstance(one, dict) or not {first, second} <= one.keys():
                raise _wrong(at, f"an object with '{first}' and '{second}'", one)
            parts = (
                kind.read(one[first], f"{at}.{first}"),
                other.read(one[second], f"{at}.{second}"),
            )
            found.append(parts)
        return tuple(found)

    return Kind(
        lambda values: [{first: kind.write(a), second: other.write(b)} for a, b in values], read
    )


def words(*known: str) -> Kind:
    """Return the kind of texts of which only some are known."""

    def read(value: object, place: str) -> object:
        if value not in known:
            raise _wrong(place, " or ".join(f"'{word}'" for word in known), value)
        return value

    return Kind(lambda value: value, read)
