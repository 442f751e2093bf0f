"""The cards of a netlist, each with its exact place in the bytes it came from."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Protocol

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator, Mapping, Sequence
    from pathlib import Path

    from evenstage.errors import Notice
    from evenstage.netlist.callees import Callees
    from evenstage.netlist.devices import IntArray
    from evenstage.netlist.functions import Function
    from evenstage.netlist.intake import Values, WordList
    from evenstage.source import SourceText, Span


@dataclass(frozen=True, slots=True)
class Parameter:
    """One ``name=value`` of a card.

    Parameters
    ----------
    name : str
        In lower case.
    text : str
        The value as written, quotes or braces included, continuations taken out.
    name_span, span : Span
        The bytes of the name and of the value.
    """

    name: str
    text: str
    name_span: Span
    span: Span


@dataclass(frozen=True, slots=True, kw_only=True)
class Card:
    """One element card.

    Parameters
    ----------
    number : int
        Position among all element cards of the netlist, in reading order.
    letter : str
        Lower-case first letter: ``m``, ``x``, ``r``, ``c``, ``v`` ...
    name : str
        As written, with its letter.
    nodes : tuple of str
        Net names as written.
    target : str
        Model of an M or D card, subcircuit of an X card, else empty.
    target_span : Span, optional
        Its bytes.
    value : Parameter, optional
        The unnamed value of an R, C, V ... card (its ``name`` is empty).
    parameters : tuple of Parameter
        In their order.
    span : Span
        From the first byte of the name to the last byte of the last value; continuations and
        comments between them are inside, a trailing comment is not.
    scope : str
        Lower-case name of the subcircuit that holds the card; empty: top level.
    """

    number: int
    letter: str
    name: str
    nodes: tuple[str, ...]
    target: str
    target_span: Span | None
    value: Parameter | None
    parameters: tuple[Parameter, ...]
    span: Span
    scope: str

    def parameter(self, name: str) -> Parameter | None:
        """Return the last parameter of a lower-case name (a repeated one overrides)."""
        return next((p for p in reversed(self.parameters) if p.name == name), None)


@dataclass(frozen=True, slots=True, kw_only=True)
class CardGroup:
    """Cards of one letter with the same number of nets and the same parameter names, in columns.

    All words are in lower case, as bytes, one per card in each column.

    Parameters
    ----------
    letter : str
        Lower-case first letter.
    numbers : Sequence of int
        Of the cards.
    names : Sequence of bytes
        With their letter.
    nodes : sequence of columns
        One per net.
    targets : Sequence of bytes
        Models or subcircuits; empty where the cards name none.
    values : Sequence of bytes
        Unnamed values; empty where the cards have none.
    parameters : Mapping of str to a column
        The values as written; of a repeated name the last.
    """

    letter: str
    numbers: Sequence[int]
    names: Sequence[bytes]
    nodes: Sequence[Sequence[bytes]]
    targets: Sequence[bytes]
    values: Sequence[bytes]
    parameters: Mapping[str, Sequence[bytes]]


@dataclass(frozen=True, slots=True, kw_only=True)
class CardColumns:
    """Cards of one letter with the same number of nets and the same parameter names, as numbers.

    Parameters
    ----------
    letter : str
        Lower-case first letter.
    numbers : IntArray, shape (n,)
        Of the cards, ascending.
    nodes : IntArray, shape (nets, n)
        Words.
    targets : IntArray, shape (n,) or (0,)
        Words: models or subcircuits, where the cards name any.
    values : Mapping of str to IntArray, shape (n,) each
        Values by the name of their parameter, the unnamed one by the empty name; of a repeated name
        the last. Those of calls have their texts kept.
    """

    letter: str
    numbers: IntArray
    nodes: IntArray
    targets: IntArray
    values: Mapping[str, IntArray]


@dataclass(frozen=True, slots=True)
class ValuePlaces:
    """Where one parameter stands on cards of one file.

    Parameters
    ----------
    source : SourceText
        The file.
    numbers : IntArray, shape (n,)
        Of the cards.
    starts, ends : IntArray, shape (n,)
        Bytes ``[start, end)`` of the value on each.
    """

    source: SourceText
    numbers: IntArray
    starts: IntArray
    ends: IntArray


class CardStore(Protocol):
    """All element cards of a netlist: one by one as objects, or many at once in columns."""

    def __len__(self) -> int: ...

    def __getitem__(self, number: int) -> Card: ...

    @property
    def words(self) -> WordList:
        """All names of nets, models and subcircuits on the cards, in lower case."""
        ...

    @property
    def values(self) -> Values:
        """All values on the cards."""
        ...

    def columns(self, numbers: Sequence[int]) -> Iterator[CardColumns]:
        """Give the cards of ascending numbers as columns of numbers, each form by itself."""
        ...

    def word_number(self, name: str) -> int:
        """Return the number of the word for a port or a global net."""
        ...

    def may_repeat(self, scope: str) -> bool:
        """Tell whether several cards of a subcircuit may have one name."""
        ...

    def groups(self, numbers: Sequence[int]) -> Iterator[CardGroup]:
        """Give the cards of ascending numbers in groups, each of at most a few thousand."""
        ...

    def name(self, number: int) -> str:
        """Return the name of a card as written."""
        ...

    def value_places(self, numbers: Sequence[int], name: str) -> Iterator[ValuePlaces]:
        """Give the places of one parameter on cards of ascending numbers, where they have it."""
        ...

    def full_names(self, numbers: Iterable[int]) -> Iterator[str]:
        """Give the names of some cards as written, behind those of their subcircuits."""
        ...

    def scope(self, number: int) -> str:
        """Return the lower-case name of the subcircuit that holds a card; empty: top level."""
        ...

    def node_name(self, number: int, position: int) -> str:
        """Return a net as written, by card number and position on the card."""
        ...


@dataclass(frozen=True, kw_only=True)
class Subcircuit:
    """One definition, or the top level (whose name is empty).

    Parameters
    ----------
    name : str
        As written; of one that another name would hide, more than that (see ``callees``). In lower
        case it is the definition's key.
    ports : tuple of str
        As written.
    defaults : tuple of Parameter
        Parameters of the ``.subckt`` card.
    assignments : tuple of Parameter
        Of the ``.param`` cards inside, in order.
    cards : Sequence of int
        Numbers of the element cards inside, in order.
    header : Span
        The ``.subckt`` card.
    name_span : Span
        The name on the ``.subckt`` card.
    body : Span
        From the first byte of the line ``.subckt`` stands on to the end of the ``.ends`` line, its
        line end included (where there is one).
    end_name_span : Span, optional
        The name on the ``.ends`` card, where it has one.
    """

    name: str
    ports: tuple[str, ...]
    defaults: tuple[Parameter, ...]
    assignments: tuple[Parameter, ...]
    cards: Sequence[int]
    header: Span | None
    name_span: Span | None
    body: Span | None
    end_name_span: Span | None

    @cached_property
    def default_names(self) -> frozenset[str]:
        """Lower-case names of the parameters a caller may pass."""
        return frozenset(p.name for p in self.defaults)


@dataclass(frozen=True, slots=True)
class ModelCard:
    """A ``.model`` card: name and type as written, parameters by lower-case name, SI values.

    The name of one inside a subcircuit has that of the subcircuit and a dot before it.
    """

    name: str
    kind: str
    values: Mapping[str, float]
    span: Span


@dataclass(frozen=True, kw_only=True)
class Netlist:
    """Every byte and every card of a netlist and the files it includes.

    Parameters
    ----------
    sources : tuple of SourceText
        The main file first, each once, whatever its names.
    names : Mapping of Path to tuple of Path
        By the path of each source the names it goes by: links may stand for it. Absolute; the
        first is that under which it was met first.
    rooted : frozenset of Path
        Paths of the sources that some card includes by a name from the root of the file system.
    callees : Callees
        What names mean that several definitions have.
    subcircuits : Mapping of str to Subcircuit
        By lower-case name.
    top : Subcircuit
        The top level.
    models : Mapping of str to ModelCard
        By lower-case name.
    local_models : Mapping of (str, str) to str
        By the key of a definition and a lower-case name on its cards: the key of the model card
        inside it, or around it, that they mean.
    global_names : tuple of str
        Nets declared by ``.global``, as written.
    functions : Mapping of str to Function
        Defined by ``.func`` and ``.param`` cards, by lower-case name.
    options : Mapping of str to float
        Numeric ``.option`` values by lower-case name, ``scale`` among them.
    notices : tuple of Notice
        What was read but not understood.
    """

    sources: tuple[SourceText, ...] = field(repr=False)
    names: Mapping[Path, tuple[Path, ...]] = field(repr=False)
    rooted: frozenset[Path] = field(repr=False)
    callees: Callees
    subcircuits: Mapping[str, Subcircuit]
    top: Subcircuit
    models: Mapping[str, ModelCard]
    local_models: Mapping[tuple[str, str], str]
    global_names: tuple[str, ...]
    functions: Mapping[str, Function]
    options: Mapping[str, float]
    notices: tuple[Notice, ...]
    _cards: CardStore = field(repr=False)

    @property
    def folder(self) -> Path:
        """The folder the main file was named in."""
        return self.names[self.sources[0].path][0].parent

    def card(self, number: int) -> Card:
        """Return the element card of a number."""
        return self._cards[number]

    def callee(self, card: Card) -> str:
        """Return the key of the definition an X card calls, whether there is one or not."""
        return self.callees.key(card.scope, card.target)

    def model_key(self, scope: str, name: str) -> str:
        """Return the key of the model that cards of a definition mean, there or not.

        Parameters
        ----------
        scope : str
            Key of the definition; empty: the top level.
        name : str
            In lower case.
        """
        return self.local_models.get((scope, name), name)

    def card_name(self, number: int) -> str:
        """Return the name of a card as written; faster than making the card."""
        return self._cards.name(number)

    @property
    def cards(self) -> CardStore:
        """All element cards, one by one or in columns."""
        return self._cards

    def card_groups(self, numbers: Sequence[int]) -> Iterator[CardGroup]:
        """Give the element cards of ascending numbers in columns, grouped by their form."""
        return self._cards.groups(numbers)

    def node_name(self, number: int, position: int) -> str:
        """Return a net as written, by card number and position on the card."""
        return self._cards.node_name(number, position)

    def __len__(self) -> int:
        return len(self._cards)
