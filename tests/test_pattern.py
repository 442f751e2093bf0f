"""Names with wildcards."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.errors import SettingsError
from evenstage.pattern import Pattern, nearest_names, select
from evenstage.source import SourceText, Span

NETS = ["clk", "A<0>", "A<1>", "wl[0]", "wl[10]", "x1.net.3"]


class TestPattern:
    @pytest.mark.parametrize(
        ("pattern", "name"),
        [
            ("clk", "CLK"),
            ("a<?>", "A<1>"),
            ("wl[*]", "wl[10]"),
            ("*", ""),
            ("a\\b", "A\\B"),
            ("x*.n", "x1.\nn.n"),
        ],
    )
    def test_fits(self, pattern: str, name: str) -> None:
        assert Pattern(pattern).fits(name)

    @pytest.mark.parametrize(
        ("pattern", "name"),
        [
            ("clk", "clk2"),
            ("a<?>", "A<10>"),
            ("wl[*]", "wl1"),
            ("x1.net.3", "x1_net_3"),
            ("?", ""),
        ],
    )
    def test_does_not_fit(self, pattern: str, name: str) -> None:
        assert not Pattern(pattern).fits(name)

    @settings(max_examples=60, deadline=None)
    @given(st.text(alphabet=st.characters(exclude_characters="*?", max_codepoint=126)))
    def test_a_name_without_wildcards_fits_itself(self, name: str) -> None:
        assert Pattern(name).fits(name)
        assert not Pattern(name).fits(name + "x")
        assert Pattern(f"{name}*").fits(name + "x")


class TestSelect:
    def test_indices_are_increasing_and_unique(self) -> None:
        assert select([Pattern("wl*"), Pattern("a<?>"), Pattern("A<0>")], NETS, "net") == [
            1,
            2,
            3,
            4,
        ]

    def test_a_name_met_twice_is_selected_twice(self) -> None:
        assert select([Pattern("CLK")], ["clk", "x", "Clk"], "net") == [0, 2]

    @settings(max_examples=60, deadline=None)
    @given(
        st.lists(st.text("aB?*", min_size=1, max_size=3), min_size=1, max_size=3),
        st.lists(st.text("AbaB", max_size=3), max_size=8),
    )
    def test_selects_what_fits(self, texts: list[str], names: list[str]) -> None:
        patterns = [Pattern(text) for text in texts]
        fitting = [i for i, name in enumerate(names) if any(p.fits(name) for p in patterns)]
        if all(any(p.fits(name) for name in names) for p in patterns):
            assert select(patterns, names, "net") == fitting
        else:
            with pytest.raises(SettingsError):
                select(patterns, names, "net")

    def test_no_pattern_selects_nothing(self) -> None:
        assert select([], NETS, "net") == []

    def test_a_pattern_that_fits_nothing_names_the_nearest(self) -> None:
        data = b'fixed = ["wl(0]"]\n'
        span = Span(SourceText(Path("b.toml"), data, "b.toml"), 10, 15)
        with pytest.raises(SettingsError) as caught:
            select([Pattern("clk"), Pattern("wl(0]", span)], NETS, "net")
        assert str(caught.value) == (
            "b.toml:1:11: no net fits 'wl(0]'; the nearest are wl[0], wl[10]"
            " (pattern-matches-nothing)\n"
            '    fixed = ["wl(0]"]\n'
            "              ^^^^^"
        )

    def test_without_anything_alike_nothing_is_suggested(self) -> None:
        with pytest.raises(SettingsError, match=re.escape("no card fits 'zzz*' (pattern")):
            select([Pattern("zzz*")], NETS, "card")


class TestNearestNames:
    def test_wildcards_do_not_count(self) -> None:
        assert nearest_names("xrow?.xnandd*", ["xrow1.xnand", "xcol.y"]) == ["xrow1.xnand"]

    def test_many_names_are_compared_by_their_first_letter(self) -> None:
        names = [f"n{i}" for i in range(30_000)] + ["clock"]
        assert nearest_names("clokc", names) == ["clock"]
