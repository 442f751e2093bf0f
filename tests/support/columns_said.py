"""What the columns of a netlist say of its cards, to be held against the cards themselves."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.netlist.expression import FormulaError
from evenstage.netlist.values import Style, plain_value

if TYPE_CHECKING:
    from evenstage.netlist.netlist import Card, CardColumns, Netlist

Said = tuple[str, tuple[bytes, ...], bytes, dict[str, tuple[float, int]]]


def folded(text: str) -> bytes:
    return text.encode("utf-8", "surrogateescape").lower()


def worth(text: str) -> tuple[float, int]:
    """Return number and style of a value; of expressions no number."""
    try:
        value = plain_value(text)
    except FormulaError:
        value = None
    return (0.0, Style.COMPUTED) if value is None else (value.number, value.style)


def said_by_card(card: Card) -> Said:
    values = {p.name: worth(p.text.lower()) for p in card.parameters}
    if card.value is not None:
        values[""] = worth(card.value.text.lower())
    return card.letter, tuple(map(folded, card.nodes)), folded(card.target), values


def said_by_columns(netlist: Netlist, cards: CardColumns) -> dict[int, Said]:
    words, values = netlist.cards.words, netlist.cards.values
    said = {}
    for row, number in enumerate(cards.numbers.tolist()):
        nodes = tuple(words.some(cards.nodes[:, row]))
        target = words[int(cards.targets[row])] if len(cards.targets) else b""
        pairs = {}
        for name, column in cards.values.items():
            numbers, styles = values.worth(column[row : row + 1])
            computed = styles[0] == Style.COMPUTED
            pairs[name] = (0.0 if computed else float(numbers[0]), int(styles[0]))
        said[number] = cards.letter, nodes, target, pairs
    return said


def both_said(netlist: Netlist) -> tuple[list[Said], list[Said]]:
    """Return what the columns say of each card, and what the card says."""
    said: dict[int, Said] = {}
    for cards in netlist.cards.columns(range(len(netlist))):
        said |= said_by_columns(netlist, cards)
    numbers = range(len(netlist))
    return [said[n] for n in numbers], [said_by_card(netlist.card(n)) for n in numbers]
