"""Source and drain areas and perimeters after a change of width.

A diffusion of area ``A`` on a transistor of width ``W`` extends ``E = A/W`` beyond the gate; its
perimeter ``P`` counts both ends and ``k = (P - 2E)/W`` sides of the width. ``E`` and ``k`` belong
to the layout and stay: the new area is ``E W'``, the new perimeter ``2E + k W'``.
"""

from __future__ import annotations

import math
from typing import Final

#: Parameter names of area and perimeter of the drain and of the source.
SIDES: Final = (("ad", "pd"), ("as", "ps"))


def edge_factor(area: float, edge: float, old: float, new: float) -> float:
    """Return the factor of a perimeter when a width changes.

    Parameters
    ----------
    area, edge : float
        m^2, m; an unknown area (NaN) counts as zero, so that the perimeter grows like the width.
    old, new : float
        Widths, m.

    Examples
    --------
    >>> edge_factor(0.3e-12, 2.6e-6, 1e-6, 2e-6)  # E = 0.3 um, k = 2: 2.6 um become 4.6 um
    1.7692307692307694
    """
    extension = 0.0 if math.isnan(area) else area / old
    edges_per_width = (edge - 2 * extension) / old
    changed = 2 * extension + edges_per_width * new
    # An area lumped here for several fingers can turn the rule upside down.
    return changed / edge if changed > 0 else new / old
