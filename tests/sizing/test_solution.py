"""What a gap is relative to."""

from __future__ import annotations

import pytest

from evenstage.sizing.solution import relative_gap


@pytest.mark.parametrize(
    ("objective", "bound", "unit", "gap"),
    [
        (10.0, 9.0, 0.0, 0.1),
        (10.0, 9.0, 10.0, 0.1),
        (0.0, -1.0, 20.0, 0.05),
        (-5.0, -6.0, 1.0, 0.2),
        (10.0, 10.5, 10.0, 0.0),
        (0.0, 0.0, 0.0, 0.0),
    ],
)
def test_relative_gap(objective: float, bound: float, unit: float, gap: float) -> None:
    assert relative_gap(objective, bound, unit) == pytest.approx(gap, rel=1e-15, abs=0)
