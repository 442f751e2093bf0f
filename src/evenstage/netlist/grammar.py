"""The grammars of the house: where they are and the parsers made of them."""

from __future__ import annotations

import re
from functools import cache
from importlib.resources import files
from pathlib import Path

from lark import Lark

#: Bytes are read as Latin-1, one character each, so positions in the text are byte offsets.
ENCODING = "latin-1"

_STARTS = {"netlist": ["netlist", "statement"], "expression": ["expression"]}


def grammar_text(name: str) -> str:
    """Return the text of a grammar by its file name without ``.lark``.

    An installed package carries the grammars inside; a checkout keeps them in its top folder.
    """
    packaged = files("evenstage") / "grammar" / f"{name}.lark"
    if packaged.is_file():
        return packaged.read_text("utf-8")
    return (Path(__file__).parents[3] / "grammar" / f"{name}.lark").read_text("utf-8")


def build(name: str, *, strict: bool = False) -> Lark:
    """Return a new parser for a grammar; strict makes every ambiguity an error."""
    return Lark(
        grammar_text(name),
        parser="lalr",
        lexer="contextual",
        start=_STARTS[name],
        g_regex_flags=re.IGNORECASE | re.ASCII,
        maybe_placeholders=False,
        strict=strict,
    )


@cache
def parser(name: str) -> Lark:
    """Return the parser for a grammar, built once."""
    return build(name)


@cache
def terminal(name: str) -> str:
    """Return the regular expression of a terminal of the netlist grammar."""
    return next(t.pattern.to_regexp() for t in parser("netlist").terminals if t.name == name)
