"""Columns: names give way, numbers never."""

from __future__ import annotations

from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.report.paper import Paper, cells
from evenstage.report.table import Column, first_that_fits, lay_out

COLUMNS = [
    Column("gate", kind="name"),
    Column("net", kind="name"),
    Column("time", kind="chart", least=10, most=30),
    Column("delay", align="right"),
]
NAMES = st.text(st.characters(codec="utf-8"), max_size=120)


class TestLayOut:
    def test_chart_takes_what_names_leave(self) -> None:
        table = lay_out(Paper(80), COLUMNS, [["xa", "n", "", "12.5"]])
        assert table.widths == (4, 3, 30, 5)
        assert table.titles() == "gate  net  time                            delay"
        assert table.line("xa", "n", "==", "12.5") == (
            "xa    n    ==                               12.5"
        )

    def test_longest_name_gives_way_first(self) -> None:
        table = lay_out(Paper(80), COLUMNS, [["x" * 90, "n" * 12, "", "12.5"]])
        assert table.widths == (47, 12, 10, 5)
        assert len(table.line("x" * 90, "n" * 12, "=" * 10, "12.5")) == 80

    def test_start_is_where_a_column_begins(self) -> None:
        table = lay_out(Paper(80), COLUMNS, [["xa", "n", "", "12.5"]], indent=3)
        line = table.line("xa", "n", "=", "12.5")
        assert [line.index(text) for text in ("xa", "=")] == [table.start(0), table.start(2)]

    @given(st.lists(st.tuples(NAMES, NAMES, st.floats(0, 1e9)), min_size=1, max_size=5))
    @settings(max_examples=60, deadline=None)
    def test_every_line_fits_and_shows_its_number(
        self, given_rows: list[tuple[str, str, float]]
    ) -> None:
        rows = [[gate, net, "", f"{delay:.3f}"] for gate, net, delay in given_rows]
        table = lay_out(Paper(80), COLUMNS, rows)
        for line, row in zip(table.lines(rows)[1:], rows, strict=True):
            assert cells(line) <= 80
            assert line.endswith(row[3])


class TestFirstThatFits:
    def test_short_names_keep_all_columns(self) -> None:
        rows = [["xa", "n", "", "1"]]
        assert first_that_fits(Paper(80), [(COLUMNS, rows), (COLUMNS[:1], [["xa"]])])[0] == 0

    def test_columns_go_before_names_become_unreadable(self) -> None:
        long = ["x" * 40, "n" * 40, "=", "1" * 40]
        choices = [(COLUMNS, [long]), (COLUMNS[:2], [long[:2]])]
        index, table = first_that_fits(Paper(80), choices)
        assert (index, table.widths) == (1, (39, 39))

    def test_last_choice_is_taken_at_any_rate(self) -> None:
        columns = [Column("", kind="name"), Column("")]
        index, table = first_that_fits(Paper(80), [(columns, [["x" * 50, "1" * 70]])])
        assert (index, table.widths) == (0, (8, 70))
