"""TOML against a schema: values, places and whole messages."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.errors import SettingsError
from evenstage.schema import Entry, Integer, Names, Number, Text
from evenstage.settings import Settings, Table, Tables, read_settings

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
        "zzz = 1",
        (
            "b.toml:1:1: unknown key zzz; no known one is like it: is this the right kind of file?"
            " (unknown-key)\n"
            "    zzz = 1\n"
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
        "b.toml:1:1: brackets are nested too deeply (bad-toml)\n    x = " + "[" * 96 + "...\n    ^",
    ),
]


class TestMistakes:
    @pytest.mark.parametrize(("text", "message"), MISTAKES)
    def test_whole_message(self, read: Read, text: str | bytes, message: str) -> None:
        with pytest.raises(SettingsError) as caught:
            read(text)
        assert str(caught.value) == message

    def test_no_such_file(self, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
        monkeypatch.chdir(tmp_path)
        with pytest.raises(SettingsError) as caught:
            read_settings("b.toml", KEYS)
        assert str(caught.value) == ("there is no file 'b.toml' (missing-file)")

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
