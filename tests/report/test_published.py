"""Every JSON document keeps the published schema, and the schema leaves out no key."""

from __future__ import annotations

import json
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import pytest
from jsonschema import Draft202012Validator

from evenstage import flow
from evenstage.report.published import schema_text
from support.blocks import SHIFTING_BLOCK

if TYPE_CHECKING:
    from collections.abc import Callable

SAMPLES: Final = Path(__file__).parents[2] / "sample_netlists"

CELLS: Final = """* a cell, and a chain of it
.subckt inv a y vdd vss
mn y a vss vss nmos w=1u l=0.13u
mp y a vdd vdd pmos w=2u l=0.13u
.ends
.subckt chain a y vdd vss
x1 a b vdd vss inv
x2 b y vdd vss inv
.ends
"""

#: All that analyses, resizes, compares, recognises and simulates one netlist.
COMMANDS: Final[dict[str, Callable[[Path, flow.Question], flow.Result]]] = {
    "analysis": flow.analyse,
    "sizing": flow.resize,
    "difference": lambda path, question: flow.diff(path, path, question),
    "circuit": flow.recognise,
    "simulation": flow.simulate,
}


def closed(schema: Any) -> Any:  # noqa: ANN401 - a part of a schema is anything
    """Return a schema whose objects hold no keys but those it names."""
    if isinstance(schema, list):
        return [closed(part) for part in schema]
    if not isinstance(schema, dict):
        return schema
    parts = {key: closed(part) for key, part in schema.items()}
    named = isinstance(parts.get("properties"), dict) and "required" in parts
    return parts | {"additionalProperties": False} if named else parts


PUBLISHED: Final = json.loads(schema_text())


def mistakes(document: Any, schema: Any = PUBLISHED) -> list[str]:  # noqa: ANN401 - JSON
    """Return where a document breaks the definition of its kind."""
    kind = {"$ref": f"#/$defs/{document['kind']}", "$defs": schema["$defs"]}
    found = Draft202012Validator(kind).iter_errors(document)
    return [f"{'.'.join(map(str, error.path))}: {error.message}" for error in found]


def of(result: flow.Result) -> Any:  # noqa: ANN401 - JSON
    return json.loads(flow.json(result))


def question(sample: str) -> flow.Question:
    folder = SAMPLES / sample
    return flow.Question(process=folder / "process.toml", brief=folder / "brief.toml")


@pytest.fixture
def cells(tmp_path: Path) -> Path:
    path = tmp_path / "cells.sp"
    path.write_text(CELLS)
    return path


def test_the_schema_is_one() -> None:
    Draft202012Validator.check_schema(PUBLISHED)


def test_kinds_are_told_apart_at_the_head() -> None:
    kinds = [choice["$ref"].removeprefix("#/$defs/") for choice in PUBLISHED["oneOf"]]
    told = [PUBLISHED["$defs"][kind]["properties"]["kind"]["const"] for kind in kinds]
    assert kinds == told
    assert {*COMMANDS, "fit", "deck"} == set(kinds)


@pytest.mark.parametrize("kind", COMMANDS)
@pytest.mark.parametrize("sample", sorted(path.name for path in SAMPLES.iterdir()))
def test_every_sample_keeps_it(sample: str, kind: str) -> None:
    document = of(COMMANDS[kind](SAMPLES / sample / "netlist.sp", question(sample)))
    assert document["kind"] == kind
    assert mistakes(document, closed(PUBLISHED)) == []


def test_two_supplies_keep_it(tmp_path: Path) -> None:
    path = tmp_path / "shifting.sp"
    path.write_text(SHIFTING_BLOCK)
    document = of(flow.recognise(path, flow.Question()))
    assert document["storage"]
    assert mistakes(document, closed(PUBLISHED)) == []


def test_a_trade_off_keeps_it(cells: Path) -> None:
    document = of(flow.resize(cells, flow.Question(), curve=True))
    assert document["trade_off"]["points"]
    assert mistakes(document, closed(PUBLISHED)) == []


def test_few_changes_keep_it(cells: Path) -> None:
    document = of(flow.resize(cells, flow.Question(), flow.Wishes(changes=1)))
    assert document["few_changes"]["points"]
    assert mistakes(document, closed(PUBLISHED)) == []


def test_a_simulated_pair_keeps_it(cells: Path) -> None:
    document = of(flow.simulate(cells, flow.Question(), after=cells))
    assert document["before"] == document["after"]
    assert document["speed_up"] == {"estimated": 1.0, "simulated": 1.0}
    assert mistakes(document, closed(PUBLISHED)) == []


def test_several_corners_keep_it(tmp_path: Path) -> None:
    asked = question("row_decoder")
    assert asked.process is not None
    slow = tmp_path / "slow.toml"
    text = asked.process.read_text("utf-8")
    slow.write_text(text.replace('name = "', 'name = "slow ', 1), "utf-8")
    corners = flow.Question(process=asked.process, corners=(slow,), brief=asked.brief)
    netlist = SAMPLES / "row_decoder" / "netlist.sp"
    for command in (flow.analyse, flow.resize, COMMANDS["difference"]):
        result = command(netlist, corners)
        document = of(result)
        assert len(document["corners"]) == 2
        assert mistakes(document, closed(PUBLISHED)) == []


def test_fit_and_deck_keep_it(cells: Path, tmp_path: Path) -> None:
    fitted = of(flow.fit_simulated(cells, flow.Question(), tmp_path / "fitted.toml"))
    deck = of(flow.write_deck(tmp_path / "deck.sp", cells, flow.Question()))
    assert [fitted["kind"], deck["kind"]] == ["fit", "deck"]
    assert mistakes(fitted, closed(PUBLISHED)) == []
    assert mistakes(deck, closed(PUBLISHED)) == []


class TestTheCheck:
    """It can fail, and it lets readers of an older schema pass."""

    def test_missing_key_and_wrong_type_are_found(self, cells: Path) -> None:
        document = of(flow.analyse(cells, flow.Question()))
        del document["paths"][0]["edge"]
        document["counts"]["gates"] = "two"
        assert mistakes(document) == [
            "counts.gates: 'two' is not of type 'integer'",
            "paths.0: 'edge' is a required property",
        ]

    def test_new_key_passes_the_published_schema_alone(self, cells: Path) -> None:
        document = of(flow.recognise(cells, flow.Question()))
        document["counts"]["cards"] = 3
        assert mistakes(document) == []
        assert len(mistakes(document, closed(PUBLISHED))) == 1
        Draft202012Validator(PUBLISHED).validate(document)
