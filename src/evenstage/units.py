"""Numbers with engineering suffixes, both ways.

A SPICE number is a decimal number, perhaps one scale factor, and letters that mean nothing:
``10 = 10V = 10Volts``, ``1000 = 1k = 1kHz``, ``1F`` is a femto-unit, ``1M`` a milli-unit. Case
never matters. The longest scale factor wins, so ``1milli`` is a thousandth of an inch.
"""

from __future__ import annotations

import math
import re
from decimal import Context, Decimal
from typing import Final

#: Powers of ten of the scale factors; ``a`` exists in some dialects only and is accepted.
_POWERS: Final = {
    "t": 12,
    "g": 9,
    "meg": 6,
    "k": 3,
    "m": -3,
    "u": -6,
    "n": -9,
    "p": -12,
    "f": -15,
    "a": -18,
}

#: One thousandth of an inch, m.
_MIL: Final = Decimal("25.4e-6")

_NUMBER: Final = re.compile(
    r"(?P<mantissa>[+-]?(?:\d+\.?\d*|\.\d+))(?:e(?P<exponent>[+-]?\d{1,6}))?"
    r"(?P<scale>meg|mil|[tgkmunpfa])?[a-z]*",
    re.IGNORECASE | re.ASCII,
)

_PREFIXES: Final = {
    12: "T",
    9: "G",
    6: "M",
    3: "k",
    0: "",
    -3: "m",
    -6: "u",
    -9: "n",
    -12: "p",
    -15: "f",
    -18: "a",
}

#: What SPICE reads back in every dialect; atto is not among it.
_SUFFIXES: Final = {power: suffix for suffix, power in _POWERS.items() if suffix != "a"} | {0: ""}


def parse_number(text: str) -> float:
    """Return the value of a SPICE number.

    The value is that of the whole decimal number, rounded once: ``parse_number("0.18u")`` equals
    ``0.18e-6`` to the last bit.

    Parameters
    ----------
    text : str
        The number, without quotes, braces or blanks around it.

    Raises
    ------
    ValueError
        If the text is no such number, or one beyond the range of a float.

    Examples
    --------
    >>> parse_number("2.2NF"), parse_number("1megohm"), parse_number("10Volts")
    (2.2e-09, 1000000.0, 10.0)
    """
    match = _NUMBER.fullmatch(text)
    if match is None:
        raise ValueError(f"{text!r} is not a number")
    mantissa, exponent, scale = match.group("mantissa", "exponent", "scale")
    power = int(exponent or 0)
    scale = (scale or "").lower()
    if scale == "mil":
        mantissa = _times_mil(mantissa)
    elif scale:
        power += _POWERS[scale]
    value = float(f"{mantissa}e{power}")
    if math.isinf(value):
        raise ValueError(f"{text!r} is too large")
    return value


def _times_mil(mantissa: str) -> str:
    """Return the decimal digits of a mantissa in mil, in metres, without rounding."""
    exact = Context(prec=len(mantissa) + 3)
    return format(exact.multiply(Decimal(mantissa), _MIL), "f")


def engineering(value: float, unit: str = "", digits: int = 3) -> str:
    """Return a value as people read it, with a prefix that leaves one to three integer digits.

    Parameters
    ----------
    value : float
        In SI units.
    unit : str
        Put behind the prefix.
    digits : int
        Significant digits; rounding is that of the exact value.

    Raises
    ------
    ValueError
        If the value is not finite.

    Examples
    --------
    >>> engineering(612e-12, "s"), engineering(999.7e-12, "s"), engineering(0.0, "s")
    ('612 ps', '1.00 ns', '0 s')
    """
    if value == 0:
        return f"0 {unit}".rstrip()
    rounded, power = _rounded(value, digits)
    if power not in _PREFIXES:
        return f"{value:.{digits - 1}e} {unit}".rstrip()
    return f"{rounded:f} {_PREFIXES[power]}{unit}".rstrip()


def suffixed(value: float, digits: int = 12) -> str:
    """Return a value as SPICE reads it, as short as the digits allow.

    Parameters
    ----------
    value : float
        In SI units.
    digits : int
        Significant digits kept.

    Raises
    ------
    ValueError
        If the value is not finite.

    Examples
    --------
    >>> suffixed(12.5e-15), suffixed(0.42e-6), suffixed(3.3e6), suffixed(0.0)
    ('12.5f', '420n', '3.3meg', '0')
    """
    if value == 0:
        return "0"
    rounded, power = _rounded(value, digits)
    if power not in _SUFFIXES:
        return f"{Decimal(f'{value:.{digits - 1}e}').normalize():e}"
    shortest = f"{rounded:f}"
    if "." in shortest:
        shortest = shortest.rstrip("0").rstrip(".")
    return shortest + _SUFFIXES[power]


def _rounded(value: float, digits: int) -> tuple[Decimal, int]:
    """Return a rounded mantissa in [1, 1000) and its power of ten, a multiple of three.

    Formatting rounds the exact value once and carries into the exponent, so nothing is left to
    go wrong at the border between two prefixes.
    """
    if not math.isfinite(value):
        raise ValueError(f"{value!r} is not a finite number")
    scientific = Decimal(f"{value:.{digits - 1}e}")
    power = scientific.adjusted() // 3 * 3
    return scientific.scaleb(-power, Context(prec=max(digits, 3))), power
