"""The number of stages against the least delay, tried one by one."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from evenstage.report.stage_count import fewer_stages, stage_count_text

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.timing.results import Analysis, Path


@pytest.fixture
def chain(analysis: Analysis) -> Callable[[int, float], Path]:
    """Make a path of so many inverters with a path effort."""
    path = analysis.paths[0]

    def make(count: int, effort: float) -> Path:
        stages = (replace(path.stages[0], function="!a"),) * count
        return replace(path, stages=stages, path_effort=effort, best_stage_count=count)

    return make


class TestFewerStages:
    @pytest.mark.parametrize(
        ("count", "effort", "best"), [(7, 64.0, 3), (7, 228.0, 5), (3, 64.0, 3), (4, 2.0, 2)]
    )
    def test_chains_of_inverters(
        self, chain: Callable[[int, float], Path], count: int, effort: float, best: int
    ) -> None:
        # N F^(1/N) + N p_inv with p_inv 1: for F 64, 5 stages take 16.5 and 3 take 15.0; for F 228,
        # 7 take 22.2, 5 take 19.8 and 3 take 21.3; for F 2, 4 take 8.8 and 2 take 4.8.
        assert fewer_stages(chain(count, effort), 1.0) == best

    def test_only_inverters_can_go(self, chain: Callable[[int, float], Path]) -> None:
        path = chain(7, 64.0)
        nands = tuple(replace(stage, function="!(a & b)") for stage in path.stages[:4])
        assert fewer_stages(replace(path, stages=nands + path.stages[4:]), 1.0) == 5

    @pytest.mark.parametrize("count", range(1, 13))
    @pytest.mark.parametrize("effort", [0.0, 1e-3, 1.0, 30.0, 1e9])
    def test_polarity_stays(
        self, chain: Callable[[int, float], Path], count: int, effort: float
    ) -> None:
        best = fewer_stages(chain(count, effort), 1.0)
        assert 1 <= best <= count
        assert (count - best) % 2 == 0


class TestText:
    def test_each_fault_has_its_words(self, chain: Callable[[int, float], Path]) -> None:
        path = chain(7, 64.0)
        assert stage_count_text(path, 1.0).startswith("7; with even efforts 3 would")
        assert stage_count_text(replace(path, best_stage_count=9), 1.0).startswith(
            "7; with even efforts 9 would"
        )
        right = chain(3, 64.0)
        assert stage_count_text(right, 1.0).startswith("3, and no other number would be faster")
