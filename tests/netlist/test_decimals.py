"""Plain decimals turned to floats all at once are what each is by itself."""

from __future__ import annotations

import re
from typing import Final

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.netlist.decimals import PLAIN, decimals

POWERS: Final = {"": 0, "f": -15, "p": -12, "n": -9, "u": -6, "k": 3}
DIGITS: Final = st.text("0123456789", max_size=6)
#: With their scale factor.
NUMBERS: Final = st.tuples(
    st.one_of(
        st.tuples(DIGITS, DIGITS.filter(bool)).map(".".join),
        DIGITS.filter(bool),
    ),
    st.sampled_from(sorted(POWERS)),
)


class TestDecimals:
    @settings(max_examples=200, deadline=None)
    @given(st.lists(NUMBERS, min_size=1), st.sampled_from(["", "w="]), st.sampled_from(" \n"))
    def test_each_is_the_float_nearest_to_what_is_written(
        self, numbers: list[tuple[str, str]], before: str, behind: str
    ) -> None:
        text = "".join(f"{before}{number}{scale}{behind}" for number, scale in numbers)
        found = decimals(text.encode())
        assert found is not None
        assert found[0].tolist() == [float(f"{n}e{POWERS[scale]}") for n, scale in numbers]
        assert found[1].tolist() == [scale != "" for _, scale in numbers]

    @pytest.mark.parametrize(
        ("text", "fits"),
        [
            ("123456789012345", True),
            ("1234567890123456", False),
            (".123456789012345", True),
            ("1.23456789012345k", True),
            ("1.234567890123456", False),
            ("0.0000001f", True),
            (".00000001f", False),
        ],
    )
    def test_too_many_digits_are_left_to_others(self, text: str, fits: bool) -> None:  # noqa: FBT001
        assert re.fullmatch(PLAIN, text.encode())
        assert (decimals(f"1 {text} 2.5u\n".encode()) is not None) == fits
