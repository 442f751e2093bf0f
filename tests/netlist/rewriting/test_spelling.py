"""New numbers in the old spelling."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.netlist.rewriting.spelling import is_number, respell, respell_count, shortest
from evenstage.units import parse_number

quick = settings(max_examples=100, deadline=None)

# Spellings met in published netlists (shared/dialects.md, "Width in many spellings"), what they
# mean in metres, a new width, and the text it must become.
SPELLINGS = [
    ("0.6u", 0.6e-6, 1.25e-6, "1.25u"),
    ("0.6u", 0.6e-6, 1.235e-6, "1.235u"),
    ("0.6u", 0.6e-6, 12e-6, "12u"),
    ("0.6U", 0.6e-6, 1.25e-6, "1.25U"),
    ("0.21U", 0.21e-6, 0.42e-6, "0.42U"),
    ("0.65um", 0.65e-6, 1.3e-6, "1.3um"),
    ("3.93um", 3.93e-6, 0.995e-6, "0.995um"),
    ("81.0n", 81e-9, 120e-9, "120.0n"),
    ("640.00n", 640e-9, 1235e-9, "1235.00n"),
    ("650000u", 0.65e-6, 1.235e-6, "1235000u"),
    ("1.12e+06u", 1.12e-6, 2.5e-6, "2.5e+06u"),
    ("1.12e+06u", 1.12e-6, 0.5e-6, "5e+05u"),
    ("8.2e-07", 8.2e-7, 1.235e-6, "1.235e-06"),
    ("8.2E-7", 8.2e-7, 12.5e-6, "1.25E-5"),
    ("650e-9", 650e-9, 1235e-9, "1235e-9"),
    ("0.65", 0.65e-6, 1.235e-6, "1.235"),
    (".65", 0.65e-6, 0.8e-6, ".8"),
    (".65u", 0.65e-6, 1.3e-6, "1.3u"),
    ("2.u", 2e-6, 3e-6, "3.u"),
    ("120", 600e-9, 1235e-9, "247"),
    ("'50n'", 50e-9, 75e-9, "'75n'"),
    ("{ 0.6u }", 0.6e-6, 1.2e-6, "{ 1.2u }"),
    ('"0.6u"', 0.6e-6, 1.2e-6, '"1.2u"'),
    ("1e6", 1e-6, 25e-6, "2.5e7"),
    ("2mil", 50.8e-6, 25.4e-6, "1mil"),
]


class TestRespell:
    @pytest.mark.parametrize(("text", "old", "new", "expected"), SPELLINGS)
    def test_keeps_the_spelling(self, text: str, old: float, new: float, expected: str) -> None:
        assert respell(text, old, new) == expected

    @quick
    @given(
        st.sampled_from([(text, old) for text, old, _, _ in SPELLINGS if "mil" not in text]),
        st.integers(20_000, 900_000_000),
    )
    def test_reads_back_as_the_new_width(
        self, spelling: tuple[str, float], picometres: int
    ) -> None:
        text, old = spelling
        new = picometres * 1e-12
        read_back = parse_number(respell(text, old, new).strip("'\"{} "))
        scale = old / parse_number(text.strip("'\"{} "))
        assert read_back * scale == pytest.approx(new, rel=1e-9, abs=0)

    def test_a_width_that_is_no_short_decimal_is_cut_where_it_does_not_matter(self) -> None:
        # 1 um is 0.0393700787... mil: seven digits carry it to 1e-6.
        assert respell("2mil", 50.8e-6, 1e-6) == "0.03937008mil"

    @quick
    @given(st.integers(20, 20_000))
    def test_carries_no_float_noise(self, steps: int) -> None:
        # 5 nm grid: at most three decimals of a micron, whatever the floats say.
        text = respell("0.6u", 0.6e-6, steps * 5e-9)
        assert len(text.removesuffix("u").partition(".")[2]) <= 3

    @quick
    @given(st.sampled_from(SPELLINGS))
    def test_there_and_back_is_the_same_number(
        self, spelling: tuple[str, float, float, str]
    ) -> None:
        text, old, new, _ = spelling
        back = respell(respell(text, old, new), new, old)
        assert parse_number(back.strip("'\"{} ")) == parse_number(text.strip("'\"{} "))

    @pytest.mark.parametrize("text", ["wn", "'2*wn'", "", "1u*2", "w1", "0.6u 0.7u"])
    def test_refuses_what_is_no_number(self, text: str) -> None:
        assert not is_number(text)
        with pytest.raises(ValueError, match="no number"):
            respell(text, 1.0, 2.0)


class TestRespellCount:
    @pytest.mark.parametrize(("text", "expected"), [("4", "6"), ("'4'", "'6'"), ("4.0", "6.0")])
    def test_writes_counts_as_counts(self, text: str, expected: str) -> None:
        assert respell_count(text, 4, 6) == expected


class TestShortest:
    @pytest.mark.parametrize(
        ("value", "expected"),
        [(1.2349999999999999, "1.235"), (1 / 3, "0.3333333"), (600.0, "600"), (2e-7, "2e-7")],
    )
    def test_value(self, value: float, expected: str) -> None:
        assert float(shortest(value)) == float(expected)
