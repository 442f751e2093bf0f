"""Fingers and fins: what a drawn width becomes on the card.

A drawn width is that of one copy, all fingers together. The card says it as a total, per finger, or
as a count of fins; a finger has a greatest width, so a wide transistor needs several.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from evenstage.process.process import Transistor

#: Relative room for the noise of binary arithmetic where a width is an exact multiple.
_NOISE: Final = 1e-9


@dataclass(frozen=True, slots=True)
class Drawing:
    """How a transistor is drawn.

    Parameters
    ----------
    width : float
        m, all fingers together.
    fingers : float
        Their number.
    """

    width: float
    fingers: float


def fingers_needed(width: float, fingers: float, transistor: Transistor) -> float:
    """Return the number of fingers a width needs; never fewer than there are.

    Parameters
    ----------
    width : float
        m, all fingers together.
    fingers : float
        Their number now.
    transistor : Transistor
        Its ``finger_width_max`` counts.

    Examples
    --------
    >>> from evenstage.process.process import Transistor
    >>> nch = Transistor(models=(), polarity="n", length=60e-9, r_w=2e-3, c_gate=1e-9,
    ...     c_drain=1e-9, finger_width_max=2e-6)
    >>> fingers_needed(2e-6, 1, nch), fingers_needed(5e-6, 1, nch), fingers_needed(1e-6, 4, nch)
    (1, 3, 4)
    """
    if transistor.finger_width_max is None or transistor.width_is == "fins":
        return fingers
    return max(fingers, math.ceil(width / transistor.finger_width_max * (1 - _NOISE)))


def widest(now: Drawing, transistor: Transistor) -> float | None:
    """Return the greatest width (m) without further fingers, or None for no limit.

    A transistor drawn wider than its limit may stay as it is.
    """
    if transistor.finger_width_max is None or transistor.width_is == "fins":
        return None
    return max(now.width, now.fingers * transistor.finger_width_max)


def written_ratio(now: Drawing, then: Drawing, transistor: Transistor) -> float:
    """Return the factor by which the number on the card grows."""
    ratio = then.width / now.width
    return ratio * now.fingers / then.fingers if transistor.width_is == "finger" else ratio


def drawable(width: float, now: Drawing, transistor: Transistor, step: float | None) -> float:
    """Return the width nearest to a wished one that the card can say exactly.

    Parameters
    ----------
    width : float
        m, wished, all fingers together.
    now : Drawing
        The transistor as it is.
    transistor : Transistor
        What the card's width means.
    step : float or None
        Grid of what is drawn, m: of the total, or of one finger, or the width of one fin.

    Returns
    -------
    float
        m, at least one step per finger.
    """
    if not step:
        return width
    count = fingers_needed(width, now.fingers, transistor)
    unit = step * count if transistor.width_is == "finger" else step
    return max(1, round(width / unit)) * unit
