"""The inverter that efforts are measured in."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from evenstage.process.process import Process


def unit_inverter(process: Process, smallest_n_width: float) -> tuple[float, float]:
    """Return the widths of the unit inverter's nMOS and pMOS, m.

    Without a ``unit_ratio`` both pull equally hard.

    Parameters
    ----------
    process : Process
        Its first transistor of each polarity makes the inverter.
    smallest_n_width : float
        m; taken where the process gives no ``unit_width``.
    """
    n, p = process.first("n"), process.first("p")
    ratio = p.r_w / n.r_w if process.unit_ratio is None else process.unit_ratio
    width = smallest_n_width if process.unit_width is None else process.unit_width
    return width, ratio * width
