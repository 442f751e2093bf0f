"""A number written anew the way the old one was written.

The designer's spelling carries meaning (a unit policy, a script that greps for it), so only the
digits change: quotes, suffix, unit letters, the case of every letter, the style of exponent and
decimals stay.
"""

from __future__ import annotations

import re
from decimal import Decimal
from typing import Final

_NUMBER: Final = re.compile(
    r"""(?P<before>[\s'"{]*)
        (?P<sign>[+-]?)
        (?P<digits>[0-9]+\.?[0-9]*|\.[0-9]+)
        (?P<exponent>[eE][+-]?[0-9]+)?
        (?P<after>[a-zA-Z]*[\s'"}]*)""",
    re.VERBOSE,
)
_EXACT: Final = 1e-13
_EXACT_DIGITS: Final = 10
_ROUGH_DIGITS: Final = 7


def is_number(text: str) -> bool:
    """Tell whether a value is a plain number, perhaps quoted, with suffix and unit.

    Examples
    --------
    >>> is_number("'0.6um'"), is_number("2*wn")
    (True, False)
    """
    return _NUMBER.fullmatch(text) is not None


def shortest(value: float) -> Decimal:
    """Return the decimal with the fewest digits that is a value but for noise, or 7 digits.

    A width that was rounded to a grid loses the noise of binary arithmetic; one that was not is
    cut to what matters.

    Examples
    --------
    >>> shortest(1.2349999999999999)
    Decimal('1.235')
    """
    for digits in range(1, _EXACT_DIGITS + 1):
        candidate = f"{value:.{digits - 1}e}"
        if abs(float(candidate) - value) <= _EXACT * abs(value):
            return Decimal(candidate)
    return Decimal(f"{value:.{_ROUGH_DIGITS - 1}e}")


def respell(text: str, old: float, new: float) -> str:
    """Write a new value the way the old one is written.

    Parameters
    ----------
    text : str
        The old value as written: a plain number, perhaps quoted or in braces, with suffix and unit.
    old, new : float
        What the text means and what it shall mean, both in one unit; the scale of the text follows
        from their ratio, so bare microns and ``.option scale`` need no special care.

    Returns
    -------
    str
        The text with new digits.

    Raises
    ------
    ValueError
        If the text is not a plain number or means zero: a fault of ours.

    Examples
    --------
    >>> respell("0.6u", 0.6e-6, 1.235e-6)
    '1.235u'
    >>> respell("'8.2E-07'", 0.82e-6, 12e-6)
    "'1.2E-05'"
    """
    match = _NUMBER.fullmatch(text)
    if match is None or old == 0:
        raise ValueError(f"no number to scale: {text!r}")
    digits, exponent = match["digits"], match["exponent"]
    value = float(digits + (exponent or "")) * (new / old)
    if exponent:
        written = _with_exponent(digits, exponent, value)
    else:
        written = _like(digits, shortest(value))
    return f"{match['before']}{match['sign']}{written}{match['after']}"


def respell_count(text: str, old: float, new: float) -> str:
    """Write a new count of fins or fingers the way the old one is written.

    Examples
    --------
    >>> respell_count("'4'", 4, 6)
    "'6'"
    """
    return respell(text, old, new)


def _like(model: str, value: Decimal) -> str:
    """Write a decimal with the dot, the leading and the trailing zeros of a model."""
    text = format(value, "f")
    whole, _, decimals = text.partition(".")
    model_whole, dot, model_decimals = model.partition(".")
    if model_decimals.endswith("0"):
        decimals = decimals.ljust(len(model_decimals), "0")
    if not model_whole and whole == "0":
        whole = ""
    keep_dot = decimals or (dot and not model_decimals)
    return f"{whole}.{decimals}" if keep_dot else whole


def _with_exponent(digits: str, exponent: str, value: float) -> str:
    """Write a value with an exponent, normalised where the old one was, else with the same one."""
    letter, power = exponent[0], int(exponent[1:])
    decimal = shortest(value)
    if 1 <= Decimal(digits) < 10:
        power = decimal.adjusted()
    sign = "-" if power < 0 else "+" if _signed(exponent) else ""
    width = len(exponent.lstrip("eE+-"))
    return f"{_like(digits, decimal.scaleb(-power))}{letter}{sign}{abs(power):0{width}d}"


def _signed(exponent: str) -> bool:
    """Tell whether a positive exponent of this style carries a plus sign."""
    return "+" in exponent or ("-" in exponent and len(exponent) > 3)
