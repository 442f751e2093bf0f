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

#: A number and what stands behind it, perhaps after a blank.
_QUANTITY: Final = re.compile(
    r"(?P<mantissa>[+-]?(?:\d+\.?\d*|\.\d+))(?:e(?P<exponent>[+-]?\d{1,6}))?\s?(?P<unit>.*)",
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


def parse_quantity(text: str, unit: str = "") -> float:
    """Return the value of a number that may carry a scale factor and its unit, in SI units.

    Unlike SPICE this reads no foreign unit and guesses nothing: ``10F`` (farad or femto?) and
    ``2M`` (mega or milli?) are refused.

    Parameters
    ----------
    text : str
        Such as ``12f``, ``12 fF``, ``1.4 fF/um``, ``2.4 kohm*um``; micro may be spelt u or µ.
    unit : str
        What the value is measured in, such as ``F``, ``F/m``, ``ohm*m``; empty: a plain number.

    Raises
    ------
    ValueError
        If the text is no number, its unit is another one, or its suffix could mean two things.

    Examples
    --------
    >>> parse_quantity("12 fF", "F"), parse_quantity("2.4 kohm*um", "ohm*m")
    (1.2e-14, 0.0024)
    """
    match = _QUANTITY.fullmatch(text.strip())
    if match is None:
        raise ValueError(f"{text!r} is not a number")
    mantissa, exponent, written = match.group("mantissa", "exponent", "unit")
    written = written.replace("\N{MICRO SIGN}", "u").replace("μ", "u")
    if written == "M" or (written == unit and unit in {"F", "m"}):
        other = "mega" if written == "M" else "the unit itself"
        raise ValueError(f"{text!r} is ambiguous: {written} could be a scale factor or {other}")
    power = _unit_power(written, unit)
    if power is None:
        expected = f"a number in {unit}" if unit else "a plain number"
        raise ValueError(f"{text!r} is not {expected}")
    return parse_number(f"{mantissa}e{int(exponent or 0) + power}")


def _unit_power(written: str, unit: str) -> int | None:
    """Return the power of ten that a written unit stands for; None: it is not this unit."""
    if written.lower() in _POWERS:
        return _POWERS[written.lower()]
    if not written:
        return 0
    shown, meant = _split_unit(written), _split_unit(unit)
    powers = [_prefix_power(*pair) for pair in zip(shown[::2], meant[::2], strict=False)]
    if shown[1::2] != meant[1::2] or None in powers:
        return None
    signs = [1, *(-1 if operator == "/" else 1 for operator in meant[1::2])]
    return sum(sign * power for sign, power in zip(signs, powers, strict=True) if power)


def _prefix_power(symbol: str, base: str) -> int | None:
    """Return the power of the prefix in front of a unit symbol; case matters only for M."""
    prefix = symbol[: len(symbol) - len(base)]
    if symbol[len(prefix) :].lower() != base.lower() or prefix == "M":
        return None
    return _POWERS.get(prefix.lower()) if prefix else 0


def _split_unit(unit: str) -> list[str]:
    """Split ``ohm*m`` into ``["ohm", "*", "m"]``."""
    return [part.strip() for part in re.split("([*/])", unit)]


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
