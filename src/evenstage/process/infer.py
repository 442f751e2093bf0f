"""A process for a netlist that comes without a process file."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Final

from evenstage.errors import Notice
from evenstage.process.generic import generic, usual_names
from evenstage.process.models import model_pattern, polarity_of, process_from_models

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from evenstage.pattern import Pattern
    from evenstage.process.models import ModelFacts
    from evenstage.process.process import Polarity, Process, Transistor

_POLARITIES: Final[tuple[Polarity, ...]] = ("n", "p")


def infer_process(
    models: Iterable[ModelFacts], supply: float | None = None, length: float | None = None
) -> Process:
    """Return the process that the ``.model`` cards of a netlist describe, or the generic one.

    Level-1 cards that suffice give constants. Every other MOS card tells a polarity, and what has
    no card is known by its name; both take the constants of the first type of their polarity.

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
        return _extended(generic(supply), _unknown_cards(facts, ()))
    unknown = _unknown_cards(facts, derived.transistors)
    names = tuple(pattern.text for polarity in _POLARITIES for pattern in unknown[polarity])
    process = _extended(derived, unknown)
    if not names:
        return process
    return replace(process, notices=(*process.notices, _borrowed_notice(names)))


def _unknown_cards(
    facts: Sequence[ModelFacts], known: Sequence[Transistor]
) -> dict[Polarity, tuple[Pattern, ...]]:
    """Return, by polarity, the names of the MOS cards that gave no constants."""
    covered = {pattern.text.lower() for transistor in known for pattern in transistor.models}
    names: dict[Polarity, tuple[Pattern, ...]] = {"n": (), "p": ()}
    for name, kind, _ in facts:
        polarity, pattern = polarity_of(kind), model_pattern(name)
        if polarity is not None and pattern.text.lower() not in covered:
            covered.add(pattern.text.lower())
            names[polarity] += (pattern,)
    return names


def _extended(process: Process, cards: dict[Polarity, tuple[Pattern, ...]]) -> Process:
    """Cover names beyond the process's own; a card says more than a name, so cards come first."""
    known = process.transistors if process.origin == "models" else ()
    by_card = (_renamed(process, polarity, cards[polarity]) for polarity in _POLARITIES)
    by_name = (_renamed(process, polarity, usual_names(polarity)) for polarity in _POLARITIES)
    added = (transistor for transistor in (*by_card, *by_name) if transistor.models)
    return replace(process, transistors=(*known, *added))


def _renamed(process: Process, polarity: Polarity, names: tuple[Pattern, ...]) -> Transistor:
    return replace(process.first(polarity), models=names)


def _borrowed_notice(names: tuple[str, ...]) -> Notice:
    return Notice(
        "model-not-level-1",
        "model cards that are not level 1 or lack VTO, KP or TOX take the constants of the first"
        " card of their polarity that has them",
        names=names,
    )
