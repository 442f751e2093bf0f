"""What was written as JSON is read back, and shown again as if it had just been found."""

from __future__ import annotations

import json
import re
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import pytest
from hypothesis import given
from hypothesis import strategies as st

from evenstage import flow
from evenstage.errors import DocumentError
from evenstage.report.document.convert import read_document

if TYPE_CHECKING:
    from collections.abc import Callable

SAMPLES: Final = Path(__file__).parents[3] / "sample_netlists"

CELLS: Final = """* a cell, and a chain of it
.subckt inv a y vdd vss
mn y a vss vss nmos w=1u l=0.13u
mp y a vdd vdd pmos w=2u l=0.13u
.ends
.subckt chain a y vdd vss
x1 a b vdd vss inv
x2 b c vdd vss inv
x3 c y vdd vss inv
cload y 0 200f
.ends
"""


@pytest.fixture(scope="module")
def cells(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("cells") / "cells.sp"
    path.write_text(CELLS)
    return path


@pytest.fixture(scope="module")
def faster(cells: Path) -> Path:
    path = cells.parent / "faster.sp"
    flow.resize(cells, flow.Question(), output=path)
    return path


def corners(folder: Path) -> flow.Question:
    sample = SAMPLES / "row_decoder"
    slow = folder / "slow.toml"
    text = (sample / "process.toml").read_text("utf-8")
    slow.write_text(text.replace('name = "', 'name = "slow ', 1), "utf-8")
    return flow.Question(
        process=sample / "process.toml", corners=(slow,), brief=sample / "brief.toml"
    )


DECODER: Final = SAMPLES / "row_decoder" / "netlist.sp"

#: One of every result that has a page, of a netlist, one like it, and a folder to write in.
RESULTS: Final[dict[str, Callable[[Path, Path, Path], flow.Result]]] = {
    "analysis": lambda a, _b, _folder: flow.analyse(a, flow.Question(count=3)),
    "corners": lambda _a, _b, folder: flow.analyse(DECODER, corners(folder)),
    "sized for corners": lambda cells, _b, folder: flow.resize(
        cells, replace(corners(folder), brief=None)
    ),
    "sizing": lambda a, _b, _folder: flow.resize(a, flow.Question(), curve=True),
    "least width": lambda a, _b, _folder: flow.resize(
        a, flow.Question(), flow.Wishes(delay=200e-12)
    ),
    "least energy": lambda a, _b, _folder: flow.resize(
        a, flow.Question(), flow.Wishes(delay=200e-12), spend="energy", curve=True
    ),
    "few changes": lambda a, _b, _folder: flow.resize(a, flow.Question(), flow.Wishes(changes=1)),
    "already done": lambda _a, b, _folder: flow.resize(b, flow.Question()),
    "difference": lambda a, b, _folder: flow.diff(a, b, flow.Question()),
    "corners' difference": lambda _a, _b, folder: flow.diff(DECODER, DECODER, corners(folder)),
    "simulation": lambda a, b, _folder: flow.simulate(a, flow.Question(), after=b),
    "fit": lambda a, _b, folder: flow.fit_simulated(a, flow.Question(), folder / "fitted.toml"),
}


@pytest.mark.parametrize("kind", RESULTS)
def test_a_result_read_back_looks_as_it_did(
    kind: str, cells: Path, faster: Path, tmp_path: Path
) -> None:
    result = RESULTS[kind](cells, faster, tmp_path)
    origin = flow.origin("1.0", ["some", "words"], [cells], result)
    kept = tmp_path / "result.json"
    kept.write_text(flow.json(result, origin))
    again, where = flow.report(kept, "2.0", ["report", "result.json"])
    assert flow.html(again, where) == flow.html(result, origin)
    assert flow.text(again) == flow.text(result)
    assert flow.json(again, where) == flow.json(result, origin)


def test_without_an_origin_the_page_names_the_file(cells: Path, tmp_path: Path) -> None:
    kept = tmp_path / "result.json"
    kept.write_text(flow.json(flow.analyse(cells, flow.Question())))
    result, origin = flow.report(kept, "2.0", ["report", "result.json"])
    page = flow.html(result, origin)
    assert "evenstage 2.0" in page
    assert "evenstage report result.json" in re.sub(r"</?span>", "", page)


def test_the_digests_of_included_files_are_there(cells: Path, tmp_path: Path) -> None:
    main = tmp_path / "main.sp"
    main.write_text(f"* main\n.include '{cells}'\n")
    result = flow.analyse(main, flow.Question())
    origin = flow.origin("1.0", [], [main], result)
    assert [Path(one.name).name for one in origin.files] == ["main.sp", "cells.sp"]


def read(path: Path, text: str) -> object:
    path.write_text(text, "utf-8")
    return read_document(path)[0]


class TestMistakes:
    @pytest.mark.parametrize(
        ("text", "code", "words"),
        [
            ("", "not-json", "1:1: not JSON: expecting value"),
            ('{\n "a": }', "not-json", "2:7: not JSON: expecting value"),
            ('{"a": NaN}', "not-json", "it holds NaN"),
            ("[" * 100_000, "not-json", "not JSON"),
            ("[]", "not-a-document", "the document must be an object, got []"),
            ("{}", "not-a-document", "it is no result of evenstage in format 1"),
            ('{"program": "evenstage", "format": 2}', "not-a-document", "format 1"),
            (
                '{"program": "evenstage", "format": 1, "kind": "circuit"}',
                "no-such-report",
                "there is no report of kind 'circuit'",
            ),
            (
                '{"program": "evenstage", "format": 1, "kind": "analysis"}',
                "not-a-document",
                "the document does not say its source",
            ),
        ],
    )
    def test_each_has_one_message(self, text: str, code: str, words: str, tmp_path: Path) -> None:
        with pytest.raises(DocumentError) as told:
            read(tmp_path / "result.json", text)
        assert told.value.code == code
        assert words in str(told.value)
        assert "result.json" in str(told.value)

    def test_bytes_that_are_no_text(self, tmp_path: Path) -> None:
        path = tmp_path / "result.json"
        path.write_bytes(b'{"a": "\xff"}')
        with pytest.raises(DocumentError, match="is not JSON"):
            read_document(path)

    def test_a_file_that_is_not_there(self, tmp_path: Path) -> None:
        with pytest.raises(DocumentError, match="no such file"):
            read_document(tmp_path / "result.json")

    @pytest.mark.parametrize(
        ("place", "value", "words"),
        [
            (("paths", 0, "delay_s"), "long", "'paths[0].delay_s' must be a number, got 'long'"),
            (("paths", 0, "edge"), "up", "'paths[0].edge' must be 'rise' or 'fall', got 'up'"),
            (("counts", "gates"), True, "'counts.gates' must be a whole number, got True"),
            (("ends",), {}, "'ends' must be a list, got {}"),
            (("input_caps", 0), 3, "'input_caps[0]' must be an object with 'net' and 'cap_f'"),
            (("top",), None, "'top' must be text, got None"),
        ],
    )
    def test_a_wrong_value_is_named_with_its_place(
        self, place: tuple[str | int, ...], value: object, words: str, cells: Path, tmp_path: Path
    ) -> None:
        document: Any = json.loads(flow.json(flow.analyse(cells, flow.Question())))
        part = document
        for step in place[:-1]:
            part = part[step]
        part[place[-1]] = value
        with pytest.raises(DocumentError) as told:
            read(tmp_path / "result.json", json.dumps(document))
        assert words in str(told.value)


def places(value: Any, before: tuple[str | int, ...] = ()) -> list[tuple[str | int, ...]]:  # noqa: ANN401 - JSON
    """Return the way to every part of a document."""
    if not isinstance(value, dict | list):
        return [before]
    inner = value.items() if isinstance(value, dict) else enumerate(value)
    deeper = [way for key, part in inner for way in places(part, (*before, key))]
    return [*([before] if before else []), *deeper]


@pytest.fixture(scope="module")
def simulated(cells: Path, faster: Path) -> Path:
    result = flow.simulate(cells, flow.Question(), after=faster)
    kept = cells.parent / "simulated.json"
    kept.write_text(flow.json(result, flow.origin("1.0", [], [cells], result)))
    return kept


@pytest.fixture(scope="module")
def spoiled(cells: Path) -> Path:
    return cells.parent / "spoiled.json"


@given(data=st.data())
def test_whatever_is_wrong_is_told(data: st.DataObject, simulated: Path, spoiled: Path) -> None:
    """A value of another kind, or none, makes one clear mistake or none at all."""
    document: Any = json.loads(simulated.read_bytes())
    way = data.draw(st.sampled_from(places(document)))
    part = document
    for step in way[:-1]:
        part = part[step]
    if data.draw(st.booleans()):
        del part[way[-1]]
    else:
        part[way[-1]] = data.draw(st.sampled_from([None, "x", 1, -1.5, True, [], {}, [[]]]))
    try:
        result = read(spoiled, json.dumps(document))
    except DocumentError:
        return
    assert isinstance(result, flow.Simulation)
