"""The unit inverter."""

from __future__ import annotations

from dataclasses import replace

from numpy.testing import assert_allclose

from evenstage.process.generic import generic
from evenstage.process.unit import unit_inverter


class TestUnitInverter:
    def test_equal_pull_by_default(self) -> None:
        process = generic()
        n, p = unit_inverter(process, 0.3e-6)
        assert n == 0.3e-6
        assert_allclose(process.first("n").r_w / n, process.first("p").r_w / p, rtol=1e-12, atol=0)

    def test_the_process_decides(self) -> None:
        process = replace(generic(), unit_width=1e-6, unit_ratio=1.5)
        assert unit_inverter(process, 0.3e-6) == (1e-6, 1.5e-6)
