"""One unit per column."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.report.scale import Scale, percent, plain


class TestScale:
    @pytest.mark.parametrize(
        ("values", "unit", "texts"),
        [
            ([612e-12, 41.2e-12], "s", ["612.0 ps", "41.2 ps"]),
            ([1.25e-9, 612e-12], "s", ["1.250 ns", "0.612 ns"]),
            ([999.96e-12], "s", ["1.000 ns"]),
            ([999.94e-12], "s", ["999.9 ps"]),
            ([2.4e-16], "F", ["0.240 fF"]),
            ([0.0], "s", ["0.000 s"]),
            ([-41e-12, 0.0], "s", ["-41.00 ps", "0.00 ps"]),
            ([40.7, 0.25], "", ["40.70", "0.25"]),
        ],
    )
    def test_largest_chooses_for_all(
        self, values: list[float], unit: str, texts: list[str]
    ) -> None:
        scale = Scale.of(values, unit)
        assert [scale.text(value) for value in values] == texts

    def test_least_decimals_are_kept(self) -> None:
        assert Scale.of([123.0], digits=2, least=1).text(123.0) == "123.0"

    @pytest.mark.parametrize(
        ("values", "texts"),
        [
            ([1.2e-6, 1.89e-6], ["1.20", "1.89"]),
            ([1e-6, 4e-6], ["1", "4"]),
            ([1.2346e-6], ["1.235"]),
            ([], []),
        ],
    )
    def test_trimmed_shows_no_zeros_for_nothing(
        self, values: list[float], texts: list[str]
    ) -> None:
        scale = Scale.of(values, "m").trimmed(values)
        assert [scale.number(value) for value in values] == texts

    @given(st.lists(st.floats(0, 1e3), min_size=1), st.integers(1, 6))
    @settings(max_examples=60, deadline=None)
    def test_largest_keeps_its_digits(self, values: list[float], digits: int) -> None:
        scale = Scale.of(values, "s", digits)
        largest = max(values)
        shown = float(scale.number(largest)) * scale.factor
        assert abs(shown - largest) <= max(0.51 * 10.0 ** (1 - digits) * largest, 5e-16)

    @given(st.floats(allow_nan=False, allow_infinity=False))
    @settings(max_examples=60, deadline=None)
    def test_any_number_stays_short(self, value: float) -> None:
        assert len(Scale.of([value], "s").number(value)) <= 12


class TestPlain:
    def test_zero_has_no_sign(self) -> None:
        assert [plain(-0.001, 2), plain(-0.0, 0), plain(-0.01, 2)] == ["0.00", "0", "-0.01"]

    def test_long_numbers_take_an_exponent(self) -> None:
        assert plain(123456789.0, 2) == "1.23e+08"


class TestPercent:
    @pytest.mark.parametrize(
        ("before", "after", "text"),
        [
            (612.0, 455.0, "-26 %"),
            (100.0, 106.0, "+6.0 %"),
            (100.0, 100.25, "+0.25 %"),
            (1.0, 1.0, "no change"),
            (0.0, 1.0, "from nothing"),
        ],
    )
    def test_small_changes_keep_digits(self, before: float, after: float, text: str) -> None:
        assert percent(before, after) == text
