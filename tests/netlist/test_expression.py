"""Expressions: values, precedence, and what is refused."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from evenstage.netlist.expression import FormulaError, parse_formula

VALUES = {"a": 2.0, "b": 3.0, "wn": 0.4e-6, "nf": 3.0, "zero": 0.0}


def value(text: str) -> float:
    return parse_formula(text).value(VALUES.__getitem__)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        # Suffixes and precedence as in reference_values.md Y4 to Y7 and Y18.
        ("1meg", 1e6),
        ("1m", 1e-3),
        ("1mil", 25.4e-6),
        ("2.2NF", 2.2e-9),
        ("10Volts", 10.0),
        (".5", 0.5),
        ("1e3k", 1e6),
        ("2+3*4", 14.0),
        ("(2+3)*4", 20.0),
        ("-2**2", 4.0),
        ("2**-1", 0.5),
        ("2^3^2", 512.0),
        ("7/2/2", 1.75),
        ("7-2-2", 3.0),
        ("7%4", 3.0),
        ("1+2<4", 1.0),
        ("1<2==2>1", 1.0),
        ("1==1&&0||1", 1.0),
        ("!0+1", 2.0),
        ("a>b?1:2", 2.0),
        ("a>b?1:b>a?5:6", 5.0),
        ("zero&&1/zero", 0.0),
        ("1||1/zero", 1.0),
        ("zero?1/zero:4", 4.0),
        ("A*B", 6.0),
        ("int((nf+1)/2)*wn/nf*0.29", 2 * 0.4e-6 / 3 * 0.29),
        ("max(a,b,9)", 9.0),
        ("min(a,b)", 2.0),
        ("int(-2.7)", -2.0),
        ("floor(-2.5)", -3.0),
        ("ceil(2.1)", 3.0),
        ("nint(2.5)", 3.0),
        ("ln(exp(1))", 1.0),
        ("log10(1000)", 3.0),
        ("sqrt(16)", 4.0),
        ("pow(2,10)", 1024.0),
        ("pwr(-2,2)", -4.0),
        ("abs(-3)", 3.0),
        ("sgn(-3)", -1.0),
        ("limit(5,0,2)", 2.0),
        ("if(a>1,7,8)", 7.0),
        ("agauss(5,1,3)", 5.0),
        (" a\t+\n b ", 5.0),
    ],
)
def test_value(text: str, expected: float) -> None:
    assert value(text) == pytest.approx(expected, rel=1e-15, abs=0)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "ends too early"),
        ("1+", "ends too early"),
        ("(1", "ends too early"),
        ("1 2", "cannot be read from '2' on"),
        ("1)", "cannot be read from ')' on"),
        ("2*#", "cannot be read from '#' on"),
        ("sqrt(1,2)", "gives 2 arguments to 'sqrt', which takes 1"),
        ("max(1)", "gives 1 arguments to 'max', which takes at least 2"),
        ("1/zero", "divides by zero"),
        ("sqrt(-1)", "has no value: a function got an argument it is not defined for"),
        ("ln(0)", "has no value: a function got an argument it is not defined for"),
        ("(-8)**0.5", "has no value: a function got an argument it is not defined for"),
        ("10**400", "is too large"),
        ("1e300*1e300", "has no finite value"),
        ("1e999", "holds a number that is too large"),
        ("__import__('os')", "cannot be read from ''os')' on"),
        ("a.__class__", None),
    ],
)
def test_refused(text: str, message: str | None) -> None:
    with pytest.raises((FormulaError, KeyError)) as caught:
        value(text)
    if message is not None:
        assert str(caught.value) == message


def test_long_and_deep_expressions_are_no_problem() -> None:
    assert value("+".join(["1"] * 3000)) == 3000
    assert value("(" * 1000 + "1" + ")" * 1000) == 1


def test_names_are_those_of_parameters_only() -> None:
    assert parse_formula("max(WN, 2u)*nf + x1.y").names == {"wn", "nf", "x1.y"}


NUMBERS = st.integers(0, 99).map(str)
EXPRESSIONS = st.recursive(
    NUMBERS,
    lambda inner: st.tuples(inner, st.sampled_from("+-*"), inner).map(
        lambda parts: f"({parts[0]}{parts[1]}{parts[2]})"
    ),
    max_leaves=12,
)


@given(st.lists(EXPRESSIONS, min_size=1, max_size=4), st.data())
def test_whole_number_arithmetic_is_that_of_python(parts: list[str], data: st.DataObject) -> None:
    text = parts[0]
    for part in parts[1:]:
        text += data.draw(st.sampled_from("+-*")) + part
    expected = eval(text)
    assert math.isclose(value(text), expected, rel_tol=1e-12, abs_tol=1e-9)
