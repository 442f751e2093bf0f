"""Fitted processes and measuring decks as documents."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Final, get_args

from evenstage.fitting.results import Confusion, Fit, FittedConstant, Residuals
from evenstage.pattern import Pattern
from evenstage.process.process import Polarity, Process, Transistor
from evenstage.report.document.shape import (
    NUMBER,
    TEXT,
    WHOLE,
    Field,
    Kind,
    Shape,
    Told,
    many,
    optional,
    pairs,
    words,
)
from evenstage.report.document.timing import NOTICES

if TYPE_CHECKING:
    from evenstage.fitting.results import Deck
    from evenstage.report.document.shape import Document

_PATTERN: Final = Kind(
    lambda pattern: pattern.text, lambda value, place: Pattern(TEXT.read(value, place))
)

_TRANSISTOR: Final = Shape(
    Transistor,
    Field("models", "models", many(_PATTERN)),
    Field("polarity", "polarity", words(*get_args(Polarity))),
    Field("length_m", "length", NUMBER),
    Field("r_w", "r_w", NUMBER),
    Field("r_fixed", "r_fixed", NUMBER),
    Field("c_gate", "c_gate", NUMBER),
    Field("c_drain", "c_drain", NUMBER),
)

#: What a report shows of a process.
PROCESS: Final = Shape(
    Process,
    Field("name", "name", TEXT),
    Field("supply_v", "supply", NUMBER),
    Field("transistors", "transistors", many(_TRANSISTOR.kind)),
)

_CONSTANT: Final = Shape(
    FittedConstant,
    Field("models", "models", TEXT),
    Field("polarity", "polarity", TEXT),
    Field("key", "key", TEXT),
    Field("value", "value", NUMBER),
    Field("standard_error", "error", optional(NUMBER)),
    Field("told", "told", TEXT),
)

_CONFUSION: Final = Shape(
    Confusion,
    Field("constants", "constants", pairs("polarity", TEXT, "key", TEXT)),
    Field("spread", "spread", NUMBER),
)

_RESIDUALS: Final = Shape(
    Residuals,
    Field("name", "name", TEXT),
    Field("stages", "stages", WHOLE),
    Field("count", "count", WHOLE),
    Field("bias", "bias", NUMBER),
    Field("median", "median", NUMBER),
    Field("percentile_95", "high", NUMBER),
    Field("transition_median", "transition", optional(NUMBER)),
)

_FILE: Final = Kind(str, lambda value, place: Path(TEXT.read(value, place)))

FIT: Final = Shape(
    Fit,
    Field("source", "source", TEXT),
    Field("cells", "cells", TEXT),
    Field("output", "output", optional(_FILE)),
    Told("process", lambda fit: {"name": fit.process.name, "fo4_s": fit.fo4}),
    Field("fitted", "process", PROCESS.kind),
    Field("fo4_s", "fo4", NUMBER),
    Field("measured", "measured", WHOLE),
    Field("used", "used", WHOLE),
    Field("transition_least_s", "transition_least", NUMBER),
    Field("transition_most_s", "transition_most", NUMBER),
    Field("constants", "constants", many(_CONSTANT.kind)),
    Field("not_told_apart", "confusions", many(_CONFUSION.kind)),
    Field("one_stage", "single", optional(_RESIDUALS.kind)),
    Field("several_stages", "several", optional(_RESIDUALS.kind)),
    Field("gates", "gates", many(_RESIDUALS.kind)),
    Field("notices", "notices", NOTICES),
)


def write_deck(deck: Deck) -> Document:
    """Return what a measuring deck measures as plain values."""
    return {
        "output": str(deck.output),
        "table": str(deck.table_output),
        "cells": list(deck.cells),
        "arcs": deck.arcs,
        "measurements": deck.measurements,
        "notices": NOTICES.write(deck.notices),
    }
