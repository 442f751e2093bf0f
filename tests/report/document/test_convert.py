"""The JSON documents: keys, units, and what they refuse."""

from __future__ import annotations

import json
from dataclasses import fields, replace
from typing import TYPE_CHECKING, Any, Literal

import pytest

from evenstage.report.document.convert import (
    document as document_of,
)
from evenstage.report.document.convert import (
    to_json,
)
from evenstage.timing.results import Analysis, Path, Stage

if TYPE_CHECKING:
    from evenstage.report.document.shape import Document
    from evenstage.sizing.results import Sizing
    from evenstage.timing.results import Difference

PATH_KEYS = {
    *("from", "to", "edge", "corner", "delay_s", "charged_delay_s", "logical_effort"),
    *("branching_effort", "electrical_effort", "path_effort", "parasitic_delay"),
    *("best_stage_effort", "best_stage_count", "least_delay_s", "stages"),
}
STAGE_KEYS = {
    *("instance", "function", "input", "output", "edge", "arrival_s", "delay_s"),
    *("charged_delay_s", "transition_s", "logical_effort", "electrical_effort"),
    *("branching_effort", "stage_effort", "parasitic_delay", "input_cap_f", "load_cap_f"),
    "side_branches",
}
CHANGE_KEYS = {
    *("card", "file", "line", "instance", "parameter", "old_m", "new_m", "factor", "alone_s"),
}


def read_back(document: Document) -> Any:  # noqa: ANN401 - JSON read back is anything
    return json.loads(to_json(document))


class TestAnalysisDocument:
    def test_promised_keys_exist(self, analysis: Analysis) -> None:
        document = read_back(document_of(analysis))
        head = [document[key] for key in ("program", "format", "kind")]
        assert head == ["evenstage", 1, "analysis"]
        assert {"name", "tau_s", "p_inv", "fo4_s"} <= document["process"].keys()
        assert document["counts"] == {"devices": 1040, "nets": 361, "gates": 218, "stages": 218}
        assert document["paths"][0].keys() >= PATH_KEYS
        stage = document["paths"][0]["stages"][0]
        assert stage.keys() >= STAGE_KEYS
        assert stage["side_branches"] == [{"instance": "xpre1.xnand", "pin": "b", "cap_f": 2.5e-15}]

    def test_numbers_survive_to_the_last_bit(self, analysis: Analysis) -> None:
        document = read_back(document_of(analysis))
        path, told = analysis.paths[0], document["paths"][0]
        assert told["delay_s"] == path.delay
        assert told["path_effort"] == path.path_effort
        assert [stage["load_cap_f"] for stage in told["stages"]] == [
            stage.load_cap for stage in path.stages
        ]

    @pytest.mark.parametrize(("kind", "key"), [(Path, "paths"), (Analysis, None)])
    def test_nothing_is_left_out(
        self, analysis: Analysis, kind: type[Path | Analysis], key: str | None
    ) -> None:
        document = read_back(document_of(analysis))
        told = document if key is None else document[key][0]
        extra = {None: 4, "paths": 0}[key]
        values = [field for field in fields(kind) if field.compare]
        assert len(told) == len(values) + extra

    def test_every_value_of_a_stage_is_told(self, analysis: Analysis) -> None:
        stage = read_back(document_of(analysis))["paths"][0]["stages"][0]
        assert len(stage) == len(fields(Stage))

    def test_required_time_may_be_missing(self, analysis: Analysis) -> None:
        document = read_back(document_of(analysis))
        assert [end["required_s"] for end in document["ends"][1:3]] == [None, 250e-12]


class TestSizingDocument:
    def test_promised_keys_exist(self, sizing: Sizing) -> None:
        document = read_back(document_of(sizing))
        assert document["kind"] == "sizing"
        assert document["bound_s"] == sizing.bound
        assert document["gap"] == sizing.gap
        for when in ("before", "after"):
            assert document[when]["total_width_m"] == document["total_width_m"][when]
            assert document[when]["paths"][0].keys() >= PATH_KEYS
        assert all(change.keys() >= CHANGE_KEYS for change in document["changes"])
        assert document["changes"][0]["factor"] == sizing.changes[0].factor

    @pytest.mark.parametrize(
        ("bound_on", "key"), [("delay", "bound_s"), ("width", "bound_m"), ("energy", "bound_f")]
    )
    def test_bound_has_its_unit_in_the_key(
        self, sizing: Sizing, bound_on: Literal["delay", "width", "energy"], key: str
    ) -> None:
        document = document_of(replace(sizing, bound_on=bound_on, bound=0.5))
        given = {name: document[name] for name in ("bound_s", "bound_m", "bound_f")}
        assert {name for name, value in given.items() if value is not None} == {key}
        assert given[key] == 0.5


class TestDifferenceDocument:
    def test_card_of_one_netlist_has_no_factor(self, difference: Difference) -> None:
        document = read_back(document_of(difference))
        assert document["kind"] == "difference"
        both, only = document["widths"][0], document["widths"][-1]
        assert (both["before_m"], both["after_m"], both["factor"]) == (1.2e-6, 2.4e-6, 2.0)
        assert (only["before_m"], only["after_m"], only["factor"]) == (None, 0.8e-6, None)

    def test_path_that_no_longer_exists_is_null(self, difference: Difference) -> None:
        document = read_back(document_of(replace(difference, same_path_after=None)))
        assert document["same_path_after"] is None
        assert document["same_path_before"]["from"] == "a2"


class TestToJson:
    @pytest.mark.parametrize("bad", [float("nan"), float("inf"), -float("inf")])
    def test_no_number_without_value_ever_leaves(self, analysis: Analysis, bad: float) -> None:
        with pytest.raises(ValueError, match="JSON"):
            to_json(document_of(replace(analysis, total_width=bad)))

    def test_odd_bytes_of_a_name_survive_as_ascii(self, analysis: Analysis) -> None:
        name = b"top\xff\xc3\xa9".decode("utf-8", "surrogateescape")
        text = to_json(document_of(replace(analysis, top=name)))
        assert text.isascii()
        assert json.loads(text)["top"] == name

    def test_same_result_gives_same_text(self, sizing: Sizing) -> None:
        assert to_json(document_of(sizing)) == to_json(document_of(replace(sizing)))
        assert to_json(document_of(sizing)).endswith("\n}\n")
