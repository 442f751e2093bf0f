"""TOML against a schema: values, places and whole messages."""

from __future__ import annotations

import tomllib
from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.errors import SettingsError
from evenstage.schema import Entry, Integer, Names, Number, Text
from evenstage.settings import Settings, Table, Tables, read_settings
from evenstage.source import SourceText
from evenstage.toml_places import TomlPlaces

KEYS: dict[str, Entry] = {
    "name": Text(required=True),
    "load": Number(unit="F", above=0, most=1e-6, word="as drawn"),
    "ratio": Number(least=1, default=2.0),
    "count": Integer(least=1, default=4),
    "kind": Text(choices=("width", "energy"), default="width"),
    "cards": Names(),
    "rail": Table(keys={"high": Names(), "low": Names()}),
    "output": Tables(keys={"nets": Names(required=True), "load": Number(unit="F")}),
}

Read = Callable[[str | bytes], Settings]


@pytest.fixture
def read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Read:
    monkeypatch.chdir(tmp_path)

    def reader(text: str | bytes) -> Settings:
        data = text if isinstance(text, bytes) else text.encode()
        Path("b.toml").write_bytes(data)
        return read_settings("b.toml", KEYS)

    return reader


class TestValues:
    def test_defaults(self, read: Read) -> None:
        got = read('name = "x"')
        assert got.optional_number("load") is None
        assert (got.number("ratio"), got.integer("count"), got.text("kind")) == (2.0, 4, "width")
        assert got.names("cards") == got.table("rail").names("high") == ()
        assert got.tables("output") == ()

    def test_everything_given(self, read: Read) -> None:
        got = read(
            'name = "x"\nload = "12 fF"\nratio = 3\ncount = 7\nkind = "energy"\n'
            'cards = ["a*", "b"]\nrail = {high = "vdd", low = ["vss", "gnd"]}\n'
            '[[output]]\nnets = "z"\n[[output]]\nnets = ["y"]\nload = 1e-15\n'
        )
        assert got.number("load") == 12e-15
        assert (got.number("ratio"), got.integer("count"), got.text("kind")) == (3.0, 7, "energy")
        assert [p.text for p in got.names("cards")] == ["a*", "b"]
        assert [p.text for p in got.table("rail").names("low")] == ["vss", "gnd"]
        assert [t.optional_number("load") for t in got.tables("output")] == [None, 1e-15]

    def test_a_word_may_stand_for_nothing(self, read: Read) -> None:
        assert read('name = "x"\nload = "as drawn"').optional_number("load") is None

    def test_patterns_know_their_place(self, read: Read) -> None:
        got = read('name = "é"\ncards = ["a",\n  # "no"\n  \'b\',\n]\n[[output]]\nnets = "z"\n')
        spans = [p.span for p in (*got.names("cards"), *got.tables("output")[0].names("nets"))]
        assert [(s.place, s.text) for s in spans if s] == [
            ("b.toml:2:11", "a"),
            ("b.toml:4:4", "b"),
            ("b.toml:7:9", "z"),
        ]

    def test_a_byte_order_mark_is_harmless(self, read: Read) -> None:
        got = read(b'\xef\xbb\xbfcards = "a"\r\nname = "x"\r\n')
        span = got.names("cards")[0].span
        assert span is not None
        assert span.text == "a"


#: Text of the file, and the whole message.
MISTAKES = [
    (
        'nam = "x"',
        (
            "b.toml:1:1: unknown key nam; the nearest known one is name (unknown-key)\n"
            '    nam = "x"\n'
            "    ^^^\n"
            "known here: name, load, ratio, count, kind, cards, rail, output"
        ),
    ),
    (
        'name = "x"\n[rail]\ncount = 3',
        (
            "b.toml:3:1: unknown key rail.count; it belongs above the first table of the file"
            " (unknown-key)\n"
            "    count = 3\n"
            "    ^^^^^\n"
            "known here: high, low"
        ),
    ),
    (
        "count = 3",
        "b.toml:1:1: name is missing (missing-key)\n    count = 3\n    ^",
    ),
    (
        'name = "x"\n[[output]]\nnets = "z"\n  [[output]]\nload = 1',
        (
            "b.toml:4:3: nets is missing in [[output]] (missing-key)\n"
            "      [[output]]\n"
            "      ^^^^^^^^^^"
        ),
    ),
    (
        'name = "x"\nload = 50  # fF',
        (
            "b.toml:2:8: load must be above 0 F and at most 1 uF, got 50 F (out-of-range)\n"
            "    load = 50  # fF\n"
            "           ^^"
        ),
    ),
    (
        'name = "x"\nload = "12F"',
        (
            "b.toml:2:9: load must be a number in F or \"as drawn\": '12F' is ambiguous:"
            " F could be a scale factor or the unit itself (bad-number)\n"
            '    load = "12F"\n'
            "            ^^^"
        ),
    ),
    (
        'name = "x"\nload = "12 ps"',
        (
            "b.toml:2:9: load must be a number in F or \"as drawn\": '12 ps' is not a number in F"
            " (bad-number)\n"
            '    load = "12 ps"\n'
            "            ^^^^^"
        ),
    ),
    (
        'name = "x"\nratio = nan',
        (
            "b.toml:2:9: ratio must be a number: nan is not finite (bad-number)\n"
            "    ratio = nan\n"
            "            ^^^"
        ),
    ),
    (
        'name = "x"\nratio = true',
        (
            "b.toml:2:9: ratio must be a number, got true or false (wrong-type)\n"
            "    ratio = true\n"
            "            ^^^^"
        ),
    ),
    (
        'name = "x"\nratio = 0.5',
        (
            "b.toml:2:9: ratio must be at least 1, got 0.5 (out-of-range)\n"
            "    ratio = 0.5\n"
            "            ^^^"
        ),
    ),
    (
        'name = "x"\ncount = 1.5',
        (
            "b.toml:2:9: count must be a whole number, got a number (wrong-type)\n"
            "    count = 1.5\n"
            "            ^^^"
        ),
    ),
    (
        'name = "x"\ncount = 0',
        "b.toml:2:9: count must be at least 1, got 0 (out-of-range)\n    count = 0\n            ^",
    ),
    (
        "name = 1979-05-27",
        (
            "b.toml:1:8: name must be text, got a date or time (wrong-type)\n"
            "    name = 1979-05-27\n"
            "           ^^^^^^^^^^"
        ),
    ),
    (
        'name = " "',
        'b.toml:1:9: name must not be empty (empty-text)\n    name = " "\n            ^',
    ),
    (
        'name = "x"\nkind = "wdith"',
        (
            'b.toml:2:9: kind must be "width" or "energy", got "wdith" (bad-choice)\n'
            '    kind = "wdith"\n'
            "            ^^^^^"
        ),
    ),
    (
        'name = "x"\ncards = ["a", 7]',
        (
            "b.toml:2:15: cards must hold names, got a number (wrong-type)\n"
            '    cards = ["a", 7]\n'
            "                  ^"
        ),
    ),
    (
        'name = "x"\ncards = ["a", ""]',
        (
            "b.toml:2:16: cards must not hold an empty name (empty-text)\n"
            '    cards = ["a", ""]\n'
            "                   ^"
        ),
    ),
    (
        'name = "x"\ncards = 5',
        (
            "b.toml:2:9: cards must be a list of names, got a number (wrong-type)\n"
            "    cards = 5\n"
            "            ^"
        ),
    ),
    (
        'name = "x"\n[[output]]\nnets = []',
        "b.toml:3:8: output.nets must name something (empty-list)\n    nets = []\n           ^^",
    ),
    (
        'name = "x"\nrail = "vdd"',
        (
            "b.toml:2:9: rail must be a table, got text (wrong-type)\n"
            '    rail = "vdd"\n'
            "            ^^^"
        ),
    ),
    (
        'name = "x"\n[output]\nnets = "z"',
        (
            "b.toml:2:1: output must be tables, each under [[output]], got a table (wrong-type)\n"
            "    [output]\n"
            "    ^^^^^^^^"
        ),
    ),
    (
        'name = "x"\r\nload = \r\n',
        "b.toml:2:8: not valid TOML: invalid value (bad-toml)\n    load = \n           ^",
    ),
    (
        'name = """x',
        (
            'b.toml:1:12: not valid TOML: unterminated string (bad-toml)\n    name = """x\n'
            "               ^"
        ),
    ),
    (
        b'name = "\xff"',
        (
            "b.toml:1:9: this byte is not UTF-8; save the file as UTF-8 text (not-utf-8)\n"
            '    name = "?"\n'
            "            ^"
        ),
    ),
    (
        "x = " + "[" * 3000,
        "b.toml:1:1: brackets are nested too deeply (bad-toml)\n    x = " + "[" * 3000 + "\n    ^",
    ),
]


class TestMistakes:
    @pytest.mark.parametrize(("text", "message"), MISTAKES)
    def test_whole_message(self, read: Read, text: str | bytes, message: str) -> None:
        with pytest.raises(SettingsError) as caught:
            read(text)
        assert str(caught.value) == message

    def test_a_number_beyond_floats(self, read: Read) -> None:
        with pytest.raises(SettingsError, match="ratio must be a number: too large a number"):
            read(f'name = "x"\nratio = 1{"0" * 400}')

    def test_no_such_file(self, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
        monkeypatch.chdir(tmp_path)
        with pytest.raises(SettingsError) as caught:
            read_settings("b.toml", KEYS)
        assert str(caught.value) == (
            "cannot read b.toml: no such file or directory (unreadable-file)"
        )

    def test_a_folder_is_no_file(self, tmp_path: Path) -> None:
        with pytest.raises(SettingsError, match=r"cannot read .*: is a directory"):
            read_settings(tmp_path, KEYS)

    @settings(max_examples=60, deadline=None)
    @given(st.binary(max_size=40))
    def test_any_bytes_give_settings_or_a_message(
        self, tmp_path_factory: pytest.TempPathFactory, data: bytes
    ) -> None:
        path = tmp_path_factory.getbasetemp() / "any.toml"
        path.write_bytes(data)
        with pytest.raises(SettingsError) as caught:
            read_settings(path, KEYS)
        assert caught.value.span is not None
        assert 0 <= caught.value.span.start <= caught.value.span.end <= len(data)


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
