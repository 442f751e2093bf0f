"""A truth table as a short sum of products.

The cover is irredundant, by the recursion of Minato and Morreale (Minato, "Fast generation of
irredundant sum-of-products forms from binary decision diagrams", SASIMI 1992, from memory): what
holds for both values of the last input needs no literal of it.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from evenstage.logic.switches import BoolArray

Cube = tuple[tuple[int, bool], ...]
"""Inputs that decide, each with its value."""


def cover(wanted: BoolArray, allowed: BoolArray | None = None) -> tuple[Cube, ...]:
    """Return cubes that hold wherever wanted, and nowhere but where allowed.

    Parameters
    ----------
    wanted : BoolArray, shape (2**inputs,)
        Bit ``k`` of a place is the value of input ``k`` there.
    allowed : BoolArray, optional
        Where cubes may hold; None: only where wanted.
    """
    cubes, _ = _cover(wanted, wanted if allowed is None else wanted | allowed)
    return cubes


def _cover(least: BoolArray, most: BoolArray) -> tuple[tuple[Cube, ...], BoolArray]:
    """Return cubes between two tables, and where they hold."""
    if not least.any():
        return (), np.zeros(len(least), bool)
    if most.all():
        return ((),), np.ones(len(least), bool)
    last, half = len(least).bit_length() - 2, len(least) // 2
    (least0, least1), (most0, most1) = least.reshape(2, half), most.reshape(2, half)
    cubes0, held0 = _cover(least0 & ~most1, most0)
    cubes1, held1 = _cover(least1 & ~most0, most1)
    cubes, held = _cover((least0 & ~held0) | (least1 & ~held1), most0 & most1)
    found = (
        *(((*cube, (last, True))) for cube in cubes1),
        *(((*cube, (last, False))) for cube in cubes0),
        *cubes,
    )
    return found, np.concatenate([held | held0, held | held1])
