"""Results as tables, as graphs, and in a notebook."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path
from typing import Final
from xml.etree import ElementTree as ET

import networkx as nx
import pytest

from evenstage import flow

SAMPLE: Final = Path(__file__).parents[1] / "sample_netlists" / "pad_predriver"
ASKED: Final = flow.Question(process=SAMPLE / "process.toml", brief=SAMPLE / "brief.toml", count=3)
NETLIST: Final = SAMPLE / "netlist.sp"

HOSTILE: Final = """* names that are markup
.subckt pair <b>&a y vdd vss
mn1 x< <b>&a vss vss nmos w=1u l=0.13u
mp1 x< <b>&a vdd vdd pmos w=2u l=0.13u
mn2 y x< vss vss nmos w=1u l=0.13u
mp2 y x< vdd vdd pmos w=2u l=0.13u
.ends
"""

CELL: Final = """* a cell
.subckt inv a y vdd vss
mn y a vss vss nmos w=1u l=0.13u
mp y a vdd vdd pmos w=2u l=0.13u
.ends
"""


@pytest.fixture(scope="module")
def analysis() -> flow.Analysis:
    found = flow.analyse(NETLIST, ASKED)
    assert isinstance(found, flow.Analysis)
    return found


@pytest.fixture(scope="module")
def results(analysis: flow.Analysis, tmp_path_factory: pytest.TempPathFactory) -> list[flow.Result]:
    cells = tmp_path_factory.mktemp("cells") / "cells.sp"
    cells.write_text(CELL)
    slow = cells.with_name("slow.toml")
    process = (SAMPLE / "process.toml").read_text("utf-8")
    slow.write_text(process.replace('name = "', 'name = "slow ', 1), "utf-8")
    corners = replace(ASKED, corners=(slow,))
    return [
        analysis,
        flow.resize(NETLIST, ASKED),
        flow.diff(NETLIST, NETLIST, ASKED),
        flow.recognise(NETLIST, ASKED),
        flow.simulate(NETLIST, flow.Question(process=ASKED.process, brief=ASKED.brief)),
        flow.fit_simulated(cells, flow.Question()),
        flow.analyse(NETLIST, corners),
        flow.diff(NETLIST, NETLIST, corners),
    ]


class TestTables:
    def test_rows_of_a_table_have_the_same_plain_columns(self, results: list[flow.Result]) -> None:
        for result in results:
            assert not isinstance(result, flow.Deck)
            for rows in result.tables().values():
                assert len({tuple(row) for row in rows}) <= 1
                assert json.loads(json.dumps(rows)) == rows

    def test_stages_sum_to_the_path(self, analysis: flow.Analysis) -> None:
        tables = analysis.tables()
        for path in tables["paths"]:
            mine = [row for row in tables["stages"] if row["path"] == path["path"]]
            delays = [row["delay"] for row in mine]
            assert sum(d for d in delays if isinstance(d, float)) == pytest.approx(path["delay"])
            assert [row["stage"] for row in mine] == list(range(1, len(mine) + 1))

    def test_sizing_says_what_changes_and_what_holds(self, results: list[flow.Result]) -> None:
        sizing = results[1]
        assert isinstance(sizing, flow.Sizing)
        tables = sizing.tables()
        for row, change in zip(tables["changes"], sizing.changes, strict=True):
            assert (row["card"], row["new"], row["factor"]) == (
                change.card,
                change.new,
                change.factor,
            )
        assert [row["hold"] for row in tables["stages_after"]] == [h.hold for h in sizing.holds]

    def test_corners_tell_each_corner_s_arrival(self, results: list[flow.Result]) -> None:
        corners = results[-2]
        assert isinstance(corners, flow.Corners)
        last = corners.tables()["ends"][0]
        assert [last[f"{name} arrival"] for name in corners.names] == list(corners.ends[0].delays)


class TestGraph:
    def test_longest_way_is_the_slowest_path(self, analysis: flow.Analysis) -> None:
        graph = analysis.graph()
        slowest = analysis.paths[0]
        way = nx.dag_longest_path(graph, weight="delay")
        assert way == [
            (slowest.start, slowest.start_edge),
            *((stage.output, stage.edge) for stage in slowest.stages),
        ]
        assert graph.nodes[way[-1]]["arrival"] == pytest.approx(slowest.delay)
        assert graph.edges[way[0], way[1]]["instance"] == slowest.stages[0].instance

    def test_shared_stage_belongs_to_the_slowest_path_on_it(self, analysis: flow.Analysis) -> None:
        first, second = analysis.paths[0].stages[1], analysis.paths[0].stages[0]
        edge = ((second.output, second.edge), (first.output, first.edge))
        assert analysis.graph().edges[edge]["path"] == 1


class TestNotebook:
    def test_every_result_shows_its_headline_and_tables(self, results: list[flow.Result]) -> None:
        for result in results:
            assert not isinstance(result, flow.Deck)
            shown = result._repr_html_()
            tree = ET.fromstring(shown)  # well-formed
            assert tree.findtext("p/strong") == result.headline
            assert len(tree.findall("table")) == sum(map(bool, result.tables().values()))
            assert len(shown) < 60_000

    def test_numbers_have_their_units(self, analysis: flow.Analysis) -> None:
        assert analysis.headline == "predrv: d to pg takes 907 ps through 7 stages"
        assert ">907 ps</td>" in analysis._repr_html_()

    def test_names_are_escaped(self, tmp_path: Path) -> None:
        (tmp_path / "pair.sp").write_text(HOSTILE)
        found = flow.analyse(tmp_path / "pair.sp", flow.Question())
        assert isinstance(found, flow.Analysis)
        shown = found._repr_html_()
        assert "&lt;b&gt;&amp;a" in shown
        assert "<b>" not in shown

    def test_long_tables_are_cut_and_say_so(self) -> None:
        folder = SAMPLE.parent / "row_decoder"
        asked = flow.Question(process=folder / "process.toml", brief=folder / "brief.toml")
        found = flow.analyse(folder / "netlist.sp", asked)
        assert isinstance(found, flow.Analysis)
        ends = ET.fromstring(found._repr_html_()).findall("table")[-1]
        assert len(ends.findall("tbody/tr")) == 20
        left = len(found.ends) - 20
        assert f"ends, {left} more rows" in (ends.findtext("caption") or "")
