"""Names that differ in numbers only."""

from __future__ import annotations

from evenstage.report.families import family_name, family_of, gathered


class TestFamilyName:
    def test_star_only_where_numbers_differ(self) -> None:
        members = ["xrow[3].xnand2", "xrow[14].xnand2"]
        assert {family_of(member) for member in members} == {"xrow[*].xnand*"}
        assert family_name(members) == "xrow[*].xnand2"

    def test_single_member_keeps_its_name(self) -> None:
        assert family_name(["xrow[3].xi1"]) == "xrow[3].xi1"


class TestGathered:
    def test_families_stand_where_their_first_member_stood(self) -> None:
        assert gathered(["x1", "clk", "x2", "x30"], "x") == ["3 x x*", "clk"]
