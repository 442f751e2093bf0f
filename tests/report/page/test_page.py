"""Pages as text: whole, the same each time, nothing from outside, nothing unescaped."""

from __future__ import annotations

import re
from dataclasses import replace
from html.parser import HTMLParser
from typing import TYPE_CHECKING, Final

import pytest

from evenstage.cli import main
from evenstage.report.frame import CAUTION
from evenstage.report.origin import FileDigest, Origin
from evenstage.report.page.axis import Axis
from evenstage.report.page.element import element
from evenstage.report.page.render import html
from evenstage.report.page.symbols import symbol_of
from evenstage.report.vector_text import vector_words

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.sizing.results import Sizing
    from evenstage.timing.results import Analysis, Difference

ORIGIN: Final = Origin("1.2.3", ("analyse", "a b.sp"), (FileDigest("a b.sp", "ab" * 32),))
VOID: Final = {"meta", "link", "br"}

NETLIST: Final = """* two inverters
.subckt pair a y vdd vss
mn1 b a vss vss nmos w=1u l=0.13u
mp1 b a vdd vdd pmos w=2u l=0.13u
mn2 y b vss vss nmos w=1u l=0.13u
mp2 y b vdd vdd pmos w=2u l=0.13u
cl y vss 100f
.ends
"""


class Reader(HTMLParser):
    """Collects elements and checks that each is closed where it should be."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []
        self.found: list[tuple[str, dict[str, str | None]]] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.found.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.found.append((tag, dict(attrs)))

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag


def read(page: str) -> Reader:
    reader = Reader()
    reader.feed(page)
    reader.close()
    assert reader.open == []
    return reader


class TestPages:
    def test_analysis_names_its_slowest_path(self, analysis: Analysis) -> None:
        page = html(analysis, ORIGIN)
        read(page)
        assert "The slowest path" in page
        assert CAUTION.split(":", maxsplit=1)[0] in page

    def test_analysis_tells_vectors_and_false_paths(self, analysis: Analysis) -> None:
        page = html(analysis, ORIGIN)
        assert vector_words(analysis.paths[0]).split(",")[0] in page
        assert 'id="false"' in page
        assert 'id="false"' not in html(replace(analysis, false_paths=()), ORIGIN)

    def test_sizing_shows_changes_and_bound(self, sizing: Sizing) -> None:
        page = html(sizing, ORIGIN)
        read(page)
        assert 'id="changes"' in page
        assert "least possible delay" in page
        assert "input ceiling" in page

    def test_difference_shows_both_paths(self, difference: Difference) -> None:
        page = html(difference, ORIGIN)
        read(page)
        assert "xspare0:19" in page

    def test_says_how_to_make_it_again(self, analysis: Analysis) -> None:
        page = html(analysis, ORIGIN)
        assert "evenstage analyse &#39;a b.sp&#39;" in words(page)
        assert "ab" * 32 in page
        assert "evenstage 1.2.3" in page

    def test_needs_nothing_from_outside(self, sizing: Sizing) -> None:
        reader = read(html(sizing, ORIGIN))
        for tag, attributes in reader.found:
            for name in ("src", "href"):
                where = attributes.get(name) or "#"
                assert where.startswith(("#", "data:,")), (tag, where)
        assert "@import" not in html(sizing, ORIGIN)

    def test_is_the_same_each_time(self, sizing: Sizing) -> None:
        assert html(sizing, ORIGIN) == html(sizing, ORIGIN)

    def test_every_picture_has_words(self, sizing: Sizing) -> None:
        for tag, attributes in read(html(sizing, ORIGIN)).found:
            if tag == "svg" and attributes.get("role") == "img":
                assert attributes["aria-label"]

    @pytest.mark.parametrize("name", ["<script>alert(1)</script>", 'a"b&c', "\udcff\x07"])
    def test_names_are_text_whatever_they_hold(self, analysis: Analysis, name: str) -> None:
        path = analysis.paths[0]
        stages = tuple(replace(stage, instance=name, output=name) for stage in path.stages)
        odd = replace(analysis, top=name, paths=(replace(path, stages=stages, end=name),))
        page = html(odd, ORIGIN)
        reader = read(page)
        assert sum(tag == "script" for tag, _ in reader.found) == 1
        page.encode("utf-8")
        assert "\x07" not in page

    def test_many_path_ends_stay_small(self, analysis: Analysis) -> None:
        ends = analysis.ends * 2000
        assert len(html(replace(analysis, ends=ends), ORIGIN)) < 1_000_000


def words(page: str) -> str:
    """Return a page without its tags."""
    return re.sub(r"</?span>", "", page)


class TestCommandLine:
    def test_writes_one_page(self, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
        monkeypatch.chdir(tmp_path)
        (tmp_path / "pair.sp").write_text(NETLIST, "utf-8")
        for name in ("one.html", "two.html"):
            assert main(["resize", "pair.sp", "--html", name, "--quiet"]) == 0
        one, two = ((tmp_path / name).read_text("utf-8") for name in ("one.html", "two.html"))
        assert one.replace("one.html", "two.html") == two
        assert "resize pair.sp --html one.html --quiet" in words(one)

    def test_refuses_to_write_over_its_input(
        self, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
    ) -> None:
        monkeypatch.chdir(tmp_path)
        (tmp_path / "pair.sp").write_text(NETLIST, "utf-8")
        assert main(["analyse", "pair.sp", "--html", "pair.sp"]) == 1
        assert (tmp_path / "pair.sp").read_text("utf-8") == NETLIST


class TestSymbols:
    @pytest.mark.parametrize(
        ("function", "name", "inputs"),
        [
            ("!a", "inverter", 1),
            ("a", "buffer", 1),
            ("!(a & b & c)", "NAND", 3),
            ("!(a | b)", "NOR", 2),
            ("a & b", "AND", 2),
            ("!(a & b | c)", "AND-OR-invert", 3),
            ("!((a | b) & n)", "OR-AND-invert", 3),
            ("!(a0 & a1 | b0 & b1)", "AND-OR-invert", 4),
            ("y when !sb", "transmission gate", 1),
            ("!a when e", "tri-state inverter", 1),
            ("", "other circuit", 1),
        ],
    )
    def test_follow_the_function(self, function: str, name: str, inputs: int) -> None:
        symbol = symbol_of(function)
        assert (symbol.name, symbol.inputs) == (name, inputs)


class TestDrawing:
    def test_texts_are_escaped(self) -> None:
        drawn = element("text", "a<b", class_='x"y', x=1.004)
        assert drawn.__html__() == '<text class="x&quot;y" x="1">a&lt;b</text>'

    @pytest.mark.parametrize(("least", "most"), [(0.0, 4.5e-10), (3e-10, 3.1e-10), (0.0, 7e-7)])
    def test_ticks_are_round_and_few(self, least: float, most: float) -> None:
        axis = Axis(least, most, "s")
        ticks = axis.ticks()
        assert 3 <= len(ticks) <= 7
        for tick in ticks:
            shown = float(axis.label(tick)) * axis.scale.factor
            assert shown == pytest.approx(tick, rel=1e-6, abs=1e-18)

    def test_logarithmic_axis_has_equal_ratios(self) -> None:
        axis = Axis(0.5, 50.0, logarithmic=True)
        assert axis.at(5.0) - axis.at(0.5) == pytest.approx(axis.at(50.0) - axis.at(5.0))
