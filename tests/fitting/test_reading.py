"""The table of measurements: what it may say, and where its mistakes stand."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.errors import FitError
from evenstage.fitting.reading import read_measurements

if TYPE_CHECKING:
    from pathlib import Path

HEADER = "subcircuit,input,output,edge,transition,load,delay\n"


@pytest.fixture
def table(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    return tmp_path / "delays.csv"


class TestReadMeasurements:
    def test_columns_come_in_any_order_and_values_with_suffixes(self, table: Path) -> None:
        table.write_bytes(
            b"\xef\xbb\xbf# made by hand\r\n"
            b"Edge, delay,load,subcircuit,input,output,transition,Output Transition\r\n"
            b"\r\n"
            b'rise,12.5 ps,3f,inv,"a<0>",y,40p,\r\n'
            b"fall,-1p,0,inv,a<0>,y,4e-11,55 ps\r\n"
        )
        measured = read_measurements(table)
        assert [(q.input, q.rising) for q in measured.queries] == [("a<0>", True), ("a<0>", False)]
        assert_allclose(measured.delay, [12.5e-12, -1e-12], rtol=1e-12, atol=0)
        assert_allclose(measured.load, [3e-15, 0], rtol=1e-12, atol=0)
        assert_allclose(measured.transition, [40e-12, 40e-12], rtol=1e-12, atol=0)
        assert np.isnan(measured.output_transition[0])
        assert_allclose(measured.output_transition[1], 55e-12, rtol=1e-12, atol=0)
        assert np.isnan(measured.input_cap).all()

    @pytest.mark.parametrize(
        ("text", "message"),
        [
            (
                HEADER + "inv,a,y,up,40p,3f,12p\n",
                (
                    "delays.csv:2:9: edge must be rise or fall (of the output), got 'up' "
                    "(bad-edge)\n"
                    "    inv,a,y,up,40p,3f,12p\n"
                    "            ^^"
                ),
            ),
            (
                HEADER + "inv,a,y,rise,40p,3x,12p\n",
                (
                    "delays.csv:2:18: load: '3x' is not a number in F (bad-number)\n"
                    "    inv,a,y,rise,40p,3x,12p\n"
                    "                     ^^"
                ),
            ),
            (
                HEADER + "inv,a,y,rise,40,3f,12p\n",
                (
                    "delays.csv:2:14: transition must be above 0 and at most 0.001 s, got '40'; "
                    "numbers are in s, or carry a suffix (bad-number)\n"
                    "    inv,a,y,rise,40,3f,12p\n"
                    "                 ^^"
                ),
            ),
            (
                HEADER + "inv,a,y,rise,40p,3f\n",
                (
                    "delays.csv:2:1: 6 fields, but the header names 7 columns (bad-table)\n"
                    "    inv,a,y,rise,40p,3f\n"
                    "    ^^^^^^^^^^^^^^^^^^^"
                ),
            ),
            (
                HEADER + ",a,y,rise,40p,3f,12p\n",
                (
                    "delays.csv:2:1: subcircuit is empty (empty-field)\n"
                    "    ,a,y,rise,40p,3f,12p\n"
                    "    ^"
                ),
            ),
            (
                HEADER.replace("delay", "dely"),
                (
                    "delays.csv:1:46: unknown column 'dely'; the nearest known one is delay "
                    "(unknown-column)\n"
                    "    subcircuit,input,output,edge,transition,load,dely\n"
                    "                                                 ^^^^\n"
                    "known here: subcircuit, input, output, edge, transition, load, delay, "
                    "output_transition, input_capacitance"
                ),
            ),
            (
                HEADER.replace("delay", "load"),
                (
                    "delays.csv:1:46: column load stands twice (column-twice)\n"
                    "    subcircuit,input,output,edge,transition,load,load\n"
                    "                                                 ^^^^"
                ),
            ),
            (
                "subcircuit,input,output,edge,load,delay\n",
                (
                    "delays.csv:1:1: column transition is missing; needed are subcircuit, input, "
                    "output, edge, transition, load, delay (missing-column)\n"
                    "    subcircuit,input,output,edge,load,delay\n"
                    "    ^^^^^^^^^^"
                ),
            ),
            (
                HEADER + '"inv,a,y,rise,40p,3f,12p\n',
                (
                    "delays.csv:2:1: this field has no end: a double quote is missing (bad-table)\n"
                    '    "inv,a,y,rise,40p,3f,12p\n'
                    "    ^^^^^^^^^^^^^^^^^^^^^^^^"
                ),
            ),
            (
                HEADER,
                "'delays.csv' holds no measurement below its header (no-measurements)",
            ),
            (
                "# nothing\n\n",
                (
                    "'delays.csv' is empty; its first line must name the columns: subcircuit, "
                    "input, output, edge, transition, load, delay (no-measurements)"
                ),
            ),
        ],
    )
    def test_mistakes_are_shown_where_they_stand(
        self, table: Path, text: str, message: str
    ) -> None:
        table.write_text(text)
        with pytest.raises(FitError) as caught:
            read_measurements(type(table)("delays.csv"))
        assert str(caught.value) == message

    def test_a_missing_file_is_named(self, table: Path) -> None:
        with pytest.raises(FitError, match=r"there is no file '.*delays.csv' \(missing-file\)"):
            read_measurements(table)
