"""Where keys and values of a TOML file stand."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.source import SourceText
from evenstage.toml_places import TomlPlaces


class TestTomlPlaces:
    TEXT = (
        'a.b = 1 # one\n"c d".\'e\' = [ 1.5, "x",\n [2], ] \n'
        'f = {g = "h", i.j = """\nk""" }\n[l.m]\nn = \'\'\n[[o]]\n[[o]]\np = 1979-05-27 07:32:00\n'
        "[[o.q]]\nr = true\n[o.q.s]\nt = 0x1F"
    )

    @pytest.mark.parametrize(
        ("path", "key", "value"),
        [
            (("a", "b"), "a.b", "1"),
            (("a",), "a.b", "a.b"),
            (("c d", "e", 0), "\"c d\".'e'", "1.5"),
            (("c d", "e", 1), "\"c d\".'e'", "x"),
            (("c d", "e", 2, 0), "\"c d\".'e'", "2"),
            (("f", "g"), "g", "h"),
            (("f", "i", "j"), "i.j", "\nk"),
            (("l", "m"), "[l.m]", "[l.m]"),
            (("l", "m", "n"), "n", ""),
            (("o", 1), "[[o]]", "[[o]]"),
            (("o", 1, "p"), "p", "1979-05-27 07:32:00"),
            (("o", 1, "q", 0, "r"), "r", "true"),
            (("o", 1, "q", 0, "s", "t"), "t", "0x1F"),
            (("o", 0, "nowhere"), "[[o]]", "[[o]]"),
        ],
    )
    def test_keys_and_values(self, path: tuple[str | int, ...], key: str, value: str) -> None:
        tomllib.loads(self.TEXT)
        places = TomlPlaces(SourceText(Path("t.toml"), self.TEXT.encode(), "t.toml"))
        assert places.key(path).text == key
        assert places.value(path).text == value

    @settings(max_examples=80, deadline=None)
    @given(
        st.dictionaries(
            st.text(st.characters(min_codepoint=32, max_codepoint=0x2100), max_size=6),
            st.integers(0, 99) | st.lists(st.integers(0, 99), max_size=3) | st.booleans(),
            max_size=5,
        ),
        st.sampled_from(["inline", "under a header"]),
    )
    def test_every_value_is_found(self, table: dict[str, object], form: str) -> None:
        pairs = [f"{_quoted(key)} = {str(value).lower()}" for key, value in table.items()]
        text = (
            f"root = {{{', '.join(pairs)}}}" if form == "inline" else "\n".join(["[root]", *pairs])
        )
        places = TomlPlaces(SourceText(Path("t.toml"), text.encode(), "t.toml"))
        for key, value in table.items():
            found = places.value(("root", key)).text
            assert tomllib.loads(f"x = {found}")["x"] == value


def _quoted(key: str) -> str:
    escaped = key.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + "".join(f"\\u{ord(c):04x}" if c == "\x7f" else c for c in escaped) + '"'
