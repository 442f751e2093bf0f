"""The measuring deck: what it sets, what it measures, and how its results come back."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest
from numpy.testing import assert_allclose

from evenstage.errors import FitError
from evenstage.fitting.bench import build_bench
from evenstage.fitting.cells import standing_alone
from evenstage.fitting.deck import measuring_deck
from evenstage.fitting.fit import fit
from evenstage.fitting.reading import read_measurements, read_results
from evenstage.fitting.side_inputs import CellLogic
from evenstage.netlist.reading.read import read
from evenstage.timing.yardstick import yardstick
from support.deck_run import DeckRun
from support.measured import CELLS, measure, truth

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.fitting.results import Deck

AOI = """.subckt aoi a b c y vdd vss
mn1 y a m vss nch w=2u l=0.13u
mn2 m b vss vss nch w=2u l=0.13u
mn3 y c vss vss nch w=1u l=0.13u
mp1 k a vdd vdd pch w=4u l=0.13u
mp2 k b vdd vdd pch w=4u l=0.13u
mp3 y c k vdd pch w=4u l=0.13u
.ends
"""


@pytest.fixture
def netlist(tmp_path: Path) -> Path:
    path = tmp_path / "cells.sp"
    path.write_text(CELLS + AOI)
    return path


@pytest.fixture
def deck(netlist: Path) -> Deck:
    return measuring_deck(standing_alone(read(netlist), truth()), netlist, truth())


class TestSlowestSetting:
    @pytest.mark.parametrize(
        ("name", "pin", "rising", "input_rises", "others"),
        [
            ("nand3", "b", False, True, {"a": True, "c": True}),
            ("nand3", "b", True, False, {"a": True, "c": True}),
            ("nor3", "a", True, False, {"b": False, "c": False}),
            ("buf", "a", True, True, {}),
            # One of two parallel devices conducts: the other would help.
            ("aoi", "c", True, False, {"a": True, "b": False}),
            ("aoi", "a", False, True, {"b": True, "c": False}),
        ],
    )
    def test_side_inputs(
        self,
        netlist: Path,
        name: str,
        pin: str,
        rising: bool,  # noqa: FBT001 -- a column of the table above
        input_rises: bool,  # noqa: FBT001 -- likewise
        others: dict[str, bool],
    ) -> None:
        cells = standing_alone(read(netlist), truth())
        bench = build_bench(netlist, cells, truth())
        setting = CellLogic(bench, bench.number(name)).slowest(pin, "y", rising=rising)
        assert setting is not None
        assert setting.rising_input == input_rises
        if name != "aoi" or pin != "c":
            assert dict(setting.others) == others
        else:
            assert sorted(value for _, value in setting.others) == [False, True]


class TestMeasuringDeck:
    def test_every_arc_of_every_cell_is_measured(self, deck: Deck) -> None:
        assert deck.cells == ("inv", "inv3", "nand2", "nor3", "nand3", "nor2", "buf", "aoi")
        assert deck.arcs == 2 * (1 + 1 + 2 + 3 + 3 + 2 + 1 + 3)
        assert deck.measurements == 16 * deck.arcs
        assert deck.text.count(".measure tran d") == deck.measurements
        assert deck.table.count("\n") == deck.measurements + 1
        assert deck.notices == ()

    def test_the_first_measurement_card_by_card(self, deck: Deck, netlist: Path) -> None:
        lines = deck.text.splitlines()
        assert lines[4] == f'.include "{netlist}"'
        first = lines.index("x0 i0 o0 high 0 inv")
        start, end = lines[first + 1].split()[5], lines[first + 1].split()[7]
        assert lines[first + 1] == f"v0 i0 0 pwl(0 'supply' {start} 'supply' {end} 0)"
        assert lines[first + 3 : first + 6] == [
            (
                ".measure tran d0 trig v(i0) val='0.5*supply' fall=1 "
                "targ v(o0) val='0.5*supply' rise=1"
            ),
            (
                ".measure tran s0 trig v(o0) val='0.2*supply' rise=1 "
                "targ v(o0) val='0.8*supply' rise=1"
            ),
            ".measure tran t0 param='s0/0.6'",
        ]
        assert lines[-1] == ".end"
        assert deck.table.splitlines()[1].startswith("inv,a,y,rise,")
        assert deck.table.splitlines()[1].endswith(",d0,t0,")

    def test_results_come_back_by_name(self, deck: Deck, netlist: Path, tmp_path: Path) -> None:
        """What a process says of the deck's own points is found again from printed results."""
        table, printed = tmp_path / "deck.csv", tmp_path / "deck.log"
        table.write_text(deck.table)
        rows = [line.split(",") for line in deck.table.splitlines()[1:]]
        ones = {name: "1.0" for row in rows for name in row[6:8]}
        printed.write_text(
            "\n".join(f"{name.upper()} = {value}e-12" for name, value in ones.items())
        )
        asked = read_measurements(table, read_results(printed))
        measured, cells = measure(netlist, truth(), rows=asked)
        printed.write_text(
            "Circuit: a title\n\n  Measurements for Transient Analysis\n\n"
            + "".join(
                f"d{row} = {delay:.8e} targ= 1.0e-9 trig= 0.9e-9\nt{row} = {leaving:.8e}\n"
                for row, (delay, leaving) in enumerate(
                    zip(measured.delay, measured.output_transition, strict=True)
                )
                if row != 7
            )
            + "d7 = failed\n"
        )
        again = read_measurements(table, read_results(printed))
        assert len(again) == len(asked) - 1
        found = fit(again, cells, netlist, truth())
        for one, true in zip(found.process.transistors, truth().transistors, strict=True):
            for key in ("r_w", "stack", "slope", "shape"):
                assert_allclose(getattr(one, key), getattr(true, key), rtol=0.02, atol=0)

    def test_a_fit_of_what_a_deck_measures_finds_the_process(
        self, netlist: Path, tmp_path: Path
    ) -> None:
        """The deck is read back, its transistors integrated, its measure cards answered.

        Currents are such that an inverter driving four takes as long as the process says.
        """
        cells = [
            cell for cell in standing_alone(read(netlist), truth()) if cell.name in {"inv", "nand2"}
        ]
        deck, path = measuring_deck(cells, netlist, truth()), tmp_path / "deck.sp"
        table, printed = tmp_path / "deck.csv", tmp_path / "deck.log"
        path.write_text(deck.text)
        table.write_text(deck.table)
        results = DeckRun(path, truth()).results()
        printed.write_text("".join(f"{name} = {value:.8e}\n" for name, value in results.items()))
        measured = read_measurements(table, read_results(printed))
        assert len(measured) == deck.measurements == 96
        # Capacitances of pins are no part of a deck: they are known before, the rest is not.
        kinds = tuple(
            replace(one, r_w=1.5 * one.r_w, r_fixed=0.0, stack=1.0, slope=0.0, shape=0.0)
            for one in truth().transistors
        )
        found = fit(measured, cells, netlist, replace(truth(), transistors=kinds))
        unit = build_bench(netlist, cells, truth()).circuit.process
        # After the deck's ramps an inverter is a little faster than after another's edge.
        assert_allclose(found.fo4, yardstick(unit).fo4, rtol=0.1, atol=0)
        assert found.single is not None
        assert found.single.median < 0.02
        assert found.single.high < 0.1

    def test_a_netlist_without_cells_is_refused(self, tmp_path: Path) -> None:
        path = tmp_path / "cells.sp"
        path.write_text("* none\n.subckt top a b\nr1 a b 1k\n.ends\n")
        with pytest.raises(FitError, match="has no subcircuit with supplies that calls no other"):
            standing_alone(read(path), truth())


TITLED = """A library of cells, and .end after them
.subckt inv a y vdd vss
mn y a vss vss nch w=0.3u l=60n
mp y a vdd vdd pch w=0.6u l=60n
.ends
.end
"""


class TestTitles:
    def test_a_bench_of_cells_under_a_title(self, tmp_path: Path) -> None:
        path = tmp_path / "cells.sp"
        path.write_text(TITLED)
        bench = build_bench(path, standing_alone(read(path), truth()), truth())
        assert [cell.name for cell in bench.cells] == ["inv"]
        assert len(bench.circuit.devices) == 2

    @pytest.mark.parametrize(("title", "told"), [("A library", 1), ("* A library", 0), ("", 0)])
    def test_a_deck_tells_of_a_title_that_it_includes(
        self, title: str, told: int, tmp_path: Path
    ) -> None:
        path = tmp_path / "cells.sp"
        path.write_text("\n".join([title, *TITLED.splitlines()[1:], ""]))
        deck = measuring_deck(standing_alone(read(path), truth()), path, truth())
        assert [notice.code for notice in deck.notices] == ["title-included"] * told
