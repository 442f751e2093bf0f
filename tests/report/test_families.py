"""Names that differ in numbers only."""

from __future__ import annotations

import pytest

from evenstage.report.families import family_name, family_of, gathered


class TestFamilyName:
    @pytest.mark.parametrize(
        ("members", "name"),
        [
            (["xrow[3].xi1"], "xrow[3].xi1"),
            (["xrow[3].xi1", "xrow[14].xi1"], "xrow[3,14].xi1"),
            (["wl<6>", "wl<4>", "wl<5>"], "wl<4:6>"),
            (["x0", "x1", "x2", "x8", "x9"], "x0:2,8,9"),
            (["x0", "x2", "x4", "x6"], "x*"),
            (["xa1.x2", "xa2.x3"], "xa*.x*"),
            (["x01", "x02"], "x*"),
            (["x1", "x1"], "x1"),
        ],
    )
    def test_numbers_that_differ_are_listed(self, members: list[str], name: str) -> None:
        assert len({family_of(member) for member in members}) == 1
        assert family_name(members) == name


class TestGathered:
    def test_families_stand_where_their_first_member_stood(self) -> None:
        assert gathered(["x1", "clk", "x2", "x30"], "x") == ["3 x x1,2,30", "clk"]
