"""Junction constants of each edge are read, and written as they are read."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest
from hypothesis import given
from hypothesis import strategies as st

from evenstage.errors import SettingsError
from evenstage.process.process import Junction, Junctions
from evenstage.process.read import read_process
from evenstage.process.write import process_text
from support.blocks import plain_process

if TYPE_CHECKING:
    from pathlib import Path

_AMOUNTS = st.floats(1e-13, 1e-10).map(lambda value: float(f"{value:.6g}"))
_JUNCTION = st.builds(
    Junction,
    area=st.one_of(st.just(0.0), _AMOUNTS),
    edge=_AMOUNTS,
    overlap=st.one_of(st.just(0.0), _AMOUNTS),
    drain_fixed=st.one_of(st.just(0.0), _AMOUNTS),
    source_fixed=st.one_of(st.just(0.0), _AMOUNTS),
)

N = """
name = "invented"
supply = 1.2
[[transistor]]
models = ["n"]
polarity = "n"
length = "0.13u"
r_w = "2m"
c_gate = "1n"
c_drain = "1n"
{}
[[transistor]]
models = ["p"]
polarity = "p"
length = "0.13u"
r_w = "4m"
c_gate = "1n"
c_drain = "1n"
"""


def read(folder: Path, text: str) -> Junctions | None:
    path = folder / "p.toml"
    path.write_text(text)
    return read_process(path).first("n").junctions


class TestReading:
    def test_one_value_serves_both_edges_and_two_each_their_own(self, tmp_path: Path) -> None:
        found = read(
            tmp_path,
            N.format(
                "c_drain_area_rise = 1e-3\nc_drain_area_fall = 0.7e-3\nc_drain_edge = 2e-10\n"
                "c_drain_whole = 1e-15"
            ),
        )
        assert found == Junctions(
            rise=Junction(area=1e-3, edge=2e-10, drain_fixed=1e-15),
            fall=Junction(area=0.7e-3, edge=2e-10, drain_fixed=1e-15),
        )

    @pytest.mark.parametrize(
        ("lines", "message", "code"),
        [
            (
                "c_drain_area_rise = 1e-3\nc_drain_edge = 0",
                "c_drain_area_rise comes without c_drain_area_fall; give both",
                "half-given",
            ),
            (
                "c_drain_area_rise = 1e-3\nc_drain_area = 1e-3\nc_drain_edge = 0",
                "c_drain_area_rise comes with c_drain_area, which is for both edges",
                "given-twice",
            ),
            (
                "c_drain_whole = 1e-15",
                (
                    "c_drain_whole comes without c_drain_area; give both (0 where it counts for "
                    "nothing), or neither"
                ),
                "half-given",
            ),
        ],
    )
    def test_what_does_not_fit_together_is_said(
        self, tmp_path: Path, lines: str, message: str, code: str
    ) -> None:
        with pytest.raises(SettingsError) as caught:
            read(tmp_path, N.format(lines))
        assert f": {message} ({code})" in str(caught.value)


class TestWriting:
    @given(rise=_JUNCTION, fall=_JUNCTION)
    def test_every_junction_comes_back(
        self, tmp_path_factory: pytest.TempPathFactory, rise: Junction, fall: Junction
    ) -> None:
        junctions = Junctions(rise=rise, fall=fall)
        text = process_text(plain_process(junctions=junctions))
        assert read(tmp_path_factory.getbasetemp(), text) == junctions

    def test_what_edges_have_alike_is_written_once(self) -> None:
        both = Junction(area=1e-3, edge=2e-10)
        text = process_text(plain_process(junctions=Junctions(rise=both, fall=both)))
        assert text.count("c_drain_area = 0.001\n") == 2
        assert "_rise" not in text
        assert "whole" not in text
