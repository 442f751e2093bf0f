"""Numbers with suffixes, against the open SPICE manuals and against their own inverse."""

from __future__ import annotations

import math
from fractions import Fraction
from typing import TYPE_CHECKING

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.units import engineering, parse_number, parse_quantity, suffixed

if TYPE_CHECKING:
    from decimal import Decimal

#: A SPICE3-family user manual, chapter "Circuit Description" (scale factors and its examples).
MANUAL = [
    ("10", 10.0),
    ("10V", 10.0),
    ("10Volts", 10.0),
    ("10Hz", 10.0),
    ("1000", 1e3),
    ("1000.0", 1e3),
    ("1000Hz", 1e3),
    ("1e3", 1e3),
    ("1.0e3", 1e3),
    ("1kHz", 1e3),
    ("1k", 1e3),
    ("1T", 1e12),
    ("1G", 1e9),
    ("1meg", 1e6),
    ("1mil", 25.4e-6),
    ("1M", 1e-3),
    ("1MA", 1e-3),
    ("1MSec", 1e-3),
    ("1MMhos", 1e-3),
    ("1U", 1e-6),
    ("1n", 1e-9),
    ("1P", 1e-12),
    ("1F", 1e-15),
]

#: What the rule of the longest factor implies.
LONGEST = [("1milli", 25.4e-6), ("1megohm", 1e6), ("2.2NF", 2.2e-9), ("1a", 1e-18)]

POWERS = {
    "t": 12,
    "g": 9,
    "meg": 6,
    "k": 3,
    "m": -3,
    "u": -6,
    "n": -9,
    "p": -12,
    "f": -15,
    "a": -18,
}

#: Spellings met in openly published netlists.
MET = [
    ("650000u", 0.65),
    ("1.12e+06u", 1.12),
    ("0.65", 0.65),
    ("8.2e-07", 8.2e-7),
    ("81.0n", 81e-9),
    ("0.21U", 0.21e-6),
    ("3.93um", 3.93e-6),
    (".5u", 0.5e-6),
    ("5.u", 5e-6),
    ("-3m", -3e-3),
    ("+3", 3.0),
    ("1e", 1.0),
    ("2e-6f", 2e-21),
    ("0.022f", 0.022e-15),
]

MALFORMED = ["", "u", "nan", "inf", "-inf", "1_0", "1..2", "1e5.2", "0x10", "1 u", "1u2", "--1"]
MALFORMED += ["\N{ARABIC-INDIC DIGIT ONE}", "1\n", "1e1234567", "1µ"]


class TestParseNumber:
    @pytest.mark.parametrize(("text", "value"), MANUAL + LONGEST + MET)
    def test_value(self, text: str, value: float) -> None:
        assert parse_number(text) == value
        assert parse_number(text.upper()) == value

    @pytest.mark.parametrize("text", MALFORMED)
    def test_malformed_is_refused(self, text: str) -> None:
        with pytest.raises(ValueError, match="is not a number"):
            parse_number(text)

    def test_message_quotes_the_text(self) -> None:
        with pytest.raises(ValueError, match=r"^'1_0' is not a number$"):
            parse_number("1_0")

    def test_beyond_the_range_of_a_float(self) -> None:
        with pytest.raises(ValueError, match=r"^'1e300t' is too large$"):
            parse_number("1e300t")

    @settings(max_examples=100, deadline=None)
    @given(st.decimals(-1000, 1000, places=7), st.sampled_from(sorted(POWERS)))
    def test_rounds_once(self, mantissa: Decimal, scale: str) -> None:
        exact = Fraction(mantissa) * Fraction(10) ** POWERS[scale]
        assert parse_number(f"{mantissa:f}{scale}") == float(exact)

    @settings(max_examples=60, deadline=None)
    @given(st.decimals(-1000, 1000, places=9))
    def test_mil_rounds_once(self, mantissa: Decimal) -> None:
        exact = Fraction(mantissa) * Fraction(254, 10**7)
        assert parse_number(f"{mantissa:f}mil") == float(exact)


class TestParseQuantity:
    @pytest.mark.parametrize(
        ("text", "unit", "value"),
        [
            ("12", "F", 12.0),
            ("12f", "F", 12e-15),
            ("12 fF", "F", 12e-15),
            ("12FF", "F", 12e-15),
            (" 0.18u ", "m", 0.18e-6),
            ("0.18 um", "m", 0.18e-6),
            ("0.18µm", "m", 0.18e-6),
            ("1.2e1 ps", "s", 12e-12),
            ("3 s", "s", 3.0),
            ("1.8V", "V", 1.8),
            ("2.2 kohm", "ohm", 2200.0),
            ("2.2k", "ohm", 2200.0),
            ("1.4 fF/um", "F/m", 1.4e-9),
            ("1.4e-9 F / m", "F/m", 1.4e-9),
            ("1.4n", "F/m", 1.4e-9),
            ("2.4 kohm*um", "ohm*m", 2.4e-3),
            ("2.4e-3", "ohm*m", 2.4e-3),
            ("5k", "", 5000.0),
            ("-5 megohm", "ohm", -5e6),
        ],
    )
    def test_value(self, text: str, unit: str, value: float) -> None:
        assert parse_quantity(text, unit) == value

    @pytest.mark.parametrize(
        ("text", "unit"),
        [
            ("12 pF", "s"),
            ("12x", ""),
            ("5 Mohm", "ohm"),
            ("1.4 fF/um", "F"),
            ("1.4 fF*um", "F/m"),
            ("1.4 fF//um", "F/m"),
            ("1.4 um", "F/m"),
            ("1 mil", "m"),
        ],
    )
    def test_another_unit_is_refused(self, text: str, unit: str) -> None:
        with pytest.raises(ValueError, match=r"is not a (number in|plain number)"):
            parse_quantity(text, unit)

    @pytest.mark.parametrize(("text", "unit"), [("12F", "F"), ("0.5m", "m"), ("2M", "s")])
    def test_two_meanings_are_refused(self, text: str, unit: str) -> None:
        with pytest.raises(ValueError, match="is ambiguous"):
            parse_quantity(text, unit)

    @pytest.mark.parametrize("text", ["", "fF", "nan", "inf", "1_0 fF", "- 5"])
    def test_malformed_is_refused(self, text: str) -> None:
        with pytest.raises(ValueError, match="is not a number"):
            parse_quantity(text, "F")


class TestEngineering:
    @pytest.mark.parametrize(
        ("value", "unit", "digits", "text"),
        [
            (612e-12, "s", 3, "612 ps"),
            (1.234e-15, "F", 3, "1.23 fF"),
            (0.0, "s", 3, "0 s"),
            (-0.0, "", 3, "0"),
            (999.4e-12, "s", 3, "999 ps"),
            (999.7e-12, "s", 3, "1.00 ns"),
            (99.96e-12, "s", 3, "100 ps"),
            (9.996e-12, "s", 3, "10.0 ps"),
            (-42e-9, "m", 2, "-42 nm"),
            (612e-12, "s", 1, "600 ps"),
            (5.0, "", 3, "5.00"),
            (2.5e6, "ohm", 2, "2.5 Mohm"),
            (3e-22, "F", 3, "3.00e-22 F"),
            (1.5e15, "", 2, "1.5e+15"),
        ],
    )
    def test_text(self, value: float, unit: str, digits: int, text: str) -> None:
        assert engineering(value, unit, digits) == text

    @pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
    def test_only_finite_values_have_a_text(self, value: float) -> None:
        with pytest.raises(ValueError, match="is not a finite number"):
            engineering(value, "s")

    @settings(max_examples=100, deadline=None)
    @given(st.floats(1e-17, 1e14), st.integers(3, 9))
    def test_reads_back_within_half_a_digit(self, value: float, digits: int) -> None:
        number, _, prefix = engineering(value, digits=digits).partition(" ")
        powers = dict(zip("afpnum kMGT", range(-18, 13, 3), strict=True))
        shown = float(number) * 10.0 ** powers[prefix or " "]
        assert 1 <= float(number) < 1000
        assert abs(shown - value) <= value * 0.5000001 * 10.0 ** (1 - digits)


class TestSuffixed:
    @pytest.mark.parametrize(
        ("value", "text"),
        [
            (12.5e-15, "12.5f"),
            (0.42e-6, "420n"),
            (1e-6, "1u"),
            (100e-9, "100n"),
            (3.3e6, "3.3meg"),
            (-2e3, "-2k"),
            (7.0, "7"),
            (0.0, "0"),
            (5e-19, "5e-19"),
            (1.5e16, "1.5e+16"),
        ],
    )
    def test_text(self, value: float, text: str) -> None:
        assert suffixed(value) == text

    @settings(max_examples=100, deadline=None)
    @given(st.floats(-1e20, 1e20, allow_subnormal=False).filter(lambda x: abs(x) > 1e-25))
    def test_reads_back(self, value: float) -> None:
        assert parse_number(suffixed(value)) == float(f"{value:.11e}")

    def test_fewer_digits_round(self) -> None:
        assert suffixed(1.23456e-6, digits=3) == "1.23u"
