"""Parameter values as cards spell them: a bare number, one with a suffix, or an expression."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from enum import IntEnum
from functools import lru_cache
from typing import Final

from evenstage.netlist.expression import Formula, FormulaError, parse_formula
from evenstage.units import parse_number

_PLAIN: Final = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:e[+-]?\d+)?", re.IGNORECASE | re.ASCII)
_NUMBER: Final = re.compile(
    r"[+-]?(?:\d+\.?\d*|\.\d+)(?:e[+-]?\d+)?(?P<letters>[a-z]*)", re.IGNORECASE | re.ASCII
)
_QUOTES: Final = {"'": "'", '"': '"', "{": "}"}
_SCALES: Final = tuple("tgkmunpfa")


class Style(IntEnum):
    """How a number came about; what a bare number is worth depends on the file's habits."""

    ABSENT = 0
    BARE = 1
    SUFFIXED = 2
    COMPUTED = 3


@dataclass(frozen=True, slots=True)
class Value:
    """A parameter's value before it is evaluated.

    Parameters
    ----------
    number : float
        Suffix applied; NaN for an expression.
    style : Style
        How it is spelt.
    formula : Formula, optional
        The expression.
    """

    number: float
    style: Style
    formula: Formula | None = None


@lru_cache(maxsize=1 << 17)
def parse_value(text: str) -> Value:
    """Return the value that a parameter's text stands for.

    Parameters
    ----------
    text : str
        As on the card, quotes or braces included.

    Raises
    ------
    FormulaError
        If it is neither a number nor an expression.

    Examples
    --------
    >>> parse_value("0.18u").number, parse_value("'2*3'").formula.value({}.__getitem__)
    (1.8e-07, 6.0)
    """
    plain = _unquoted(text)
    return plain_value(text) or Value(math.nan, Style.COMPUTED, parse_formula(plain))


def plain_value(text: str) -> Value | None:
    """Return the value of a number; None for an expression.

    Raises
    ------
    FormulaError
        If the number is too large.
    """
    plain = _unquoted(text)
    number = _NUMBER.fullmatch(plain)
    if number is None:
        return None
    scaled = number["letters"].lower().startswith(_SCALES)
    return Value(_number(plain), Style.SUFFIXED if scaled else Style.BARE)


def _unquoted(text: str) -> str:
    if _QUOTES.get(text[:1], "") == text[-1:] and len(text) > 1:
        return text[1:-1].strip()
    return text


def _number(text: str) -> float:
    try:
        # The common spelling without a suffix is Python's own, and faster that way.
        number = float(text) if _PLAIN.fullmatch(text) else parse_number(text)
    except ValueError:
        number = math.inf
    if math.isinf(number):
        raise FormulaError("is too large")
    return number
