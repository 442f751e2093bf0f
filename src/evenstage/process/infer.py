"""A process for a netlist that comes without a process file."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

from evenstage.errors import Notice
from evenstage.process.generic import at_length, generic, usual_names
from evenstage.process.models import (
    model_pattern,
    polarity_of,
    process_from_models,
    with_capacitances,
)

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from evenstage.process.models import ModelFacts
    from evenstage.process.process import Polarity, Process, Transistor

_POLARITIES: Final[tuple[Polarity, ...]] = ("n", "p")


def infer_process(
    models: Iterable[ModelFacts], supply: float | None = None, length: float | None = None
) -> Process:
    """Return the process that the ``.model`` cards of a netlist describe, or the generic one.

    Level-1 cards that suffice give constants. Every other MOS card tells a polarity and the
    capacitances that mean the same at every level, and what has no card is known by its name; all
    else they take from the first type of their polarity.

    Parameters
    ----------
    models : Iterable of ModelFacts
        Name, type and parameters of each ``.model`` card.
    supply : float, optional
        V, as found on the voltage sources; None: a usual one, with a notice.
    length : float, optional
        Channel length the level-1 constants are worked out at, m.
    """
    facts = list(models)
    derived = process_from_models(facts, supply, length)
    if derived is None:
        base = generic(supply)
        # Oxide and channel make a gate only together: the length must be known by now.
        base = at_length(base, length) if length else base
        known: tuple[Transistor, ...] = ()
    else:
        base, known = derived, derived.transistors
    cards = [_from_card(base, some) for some in _unknown_cards(facts, known)]
    by_name = (
        replace(base.first(polarity), models=usual_names(polarity)) for polarity in _POLARITIES
    )
    in_order = sorted(cards, key=lambda card: card.transistor.polarity)
    by_card = (card.transistor for card in in_order)
    process = replace(base, transistors=(*known, *by_card, *by_name))
    return replace(process, notices=(*process.notices, *_notices(base, cards)))


@dataclass(frozen=True, slots=True)
class _Card:
    """A transistor type after a card that gave no constants, and which parameters it gave."""

    transistor: Transistor
    taken: tuple[str, ...]

    @property
    def name(self) -> str:
        return self.transistor.models[0].text


def _unknown_cards(
    facts: Sequence[ModelFacts], known: Sequence[Transistor]
) -> list[tuple[Polarity, ModelFacts]]:
    """Return the MOS cards that gave no constants, one for each name."""
    covered = {pattern.text.lower() for transistor in known for pattern in transistor.models}
    found: list[tuple[Polarity, ModelFacts]] = []
    for some in facts:
        polarity, name = polarity_of(some[1]), model_pattern(some[0]).text.lower()
        if polarity is not None and name not in covered:
            covered.add(name)
            found.append((polarity, some))
    return found


def _from_card(base: Process, card: tuple[Polarity, ModelFacts]) -> _Card:
    """Return the first type of a polarity with the capacitances that a card gives."""
    polarity, facts = card
    return _Card(*with_capacitances(base.first(polarity), facts, base.supply))


def _notices(base: Process, cards: Sequence[_Card]) -> list[Notice]:
    found = []
    cards = sorted(cards, key=lambda card: card.transistor.polarity)
    bare = [card.name for card in cards if not card.taken]
    if bare and base.origin == "models":
        found.append(_borrowed_notice(tuple(bare)))
    used = [card for card in cards if card.taken]
    if used:
        taken = ", ".join(dict.fromkeys(key for card in used for key in card.taken))
        message = (
            f"model cards that are not sufficient level-1 cards give their capacitances ({taken}); "
            f"resistance and slopes are those of {base.name}: give r_w, or currents, in a process "
            "file, or fit them to measurements"
        )
        names = tuple(card.name for card in used)
        found.append(Notice("capacitances-taken", message, names=names))
    return found


def _borrowed_notice(names: tuple[str, ...]) -> Notice:
    return Notice(
        "model-not-level-1",
        "model cards that are not level 1 or lack VTO, KP or TOX take the constants of the first"
        " card of their polarity that has them",
        names=names,
    )
