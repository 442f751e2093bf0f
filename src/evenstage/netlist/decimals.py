"""Plain decimal numbers of a text, turned to floats all at once.

A number of up to 15 digits is a whole number times a power of ten. Both are floats exactly as long
as the power is at most 22, so that one multiplication or division rounds once, as it must (W. D.
Clinger, "How to read floating point numbers accurately", PLDI 1990, section 3).
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.netlist.devices import FloatArray

#: A number without sign and exponent, with one of the common scale factors or none.
PLAIN: Final = rb"(?:[0-9]++(?:\.[0-9]++)?+|\.[0-9]++)[fpnuk]?+"

_ZERO, _POINT = b"0."
_DIGITS: Final = 15
_TENS: Final = np.array([float(f"1e{power}") for power in range(23)])
_WEIGHTS: Final = 10 ** np.arange(_DIGITS, dtype=np.int64)
_POWERS: Final = np.zeros(256, np.int64)
_POWERS[list(b"fpnuk")] = (-15, -12, -9, -6, 3)


def decimals(text: bytes) -> tuple[FloatArray, NDArray[np.bool_]] | None:
    """Return the numbers of a text.

    Parameters
    ----------
    text : bytes
        In lower case. Each number is written as ``PLAIN`` says, with no letter behind it, and no
        other word holds a digit or a point. A blank or a line end is last.

    Returns
    -------
    values : FloatArray, shape (n,)
        In their order; each the float nearest to what is written.
    scaled : shape (n,)
        Whether a scale factor stands behind the number.
    None
        If a number has too many digits for this.
    """
    view = np.frombuffer(text, np.uint8)
    digits = view - np.uint8(_ZERO)
    at = np.flatnonzero(digits < 10)
    gaps = np.diff(at)
    pointed = (gaps == 2) & (view[at[:-1] + 1] == _POINT)
    starts = np.append(0, np.flatnonzero((gaps != 1) & ~pointed) + 1)
    ends = np.append(starts[1:], len(at))
    lengths = ends - starts
    if lengths.max() > _DIGITS:
        return None
    weights = _WEIGHTS[np.repeat(ends, lengths) - np.arange(1, len(at) + 1)]
    whole = np.add.reduceat(digits[at] * weights, starts)
    behind = np.where(view[at[starts] - 1] == _POINT, lengths, 0)
    points = np.flatnonzero(pointed)
    number = np.searchsorted(starts, points, "right") - 1
    behind[number] = ends[number] - points - 1
    scale = _POWERS[view[at[ends - 1] + 1]]
    power = scale - behind
    if power.min() <= -len(_TENS):
        return None
    return whole * _TENS[np.maximum(power, 0)] / _TENS[np.maximum(-power, 0)], scale != 0
