"""What may stand at a key: whole messages for what may not."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from evenstage.errors import SettingsError
from evenstage.schema import Entry, Integer, Names, Number, Text
from evenstage.settings import Settings, read_settings

KEYS: dict[str, Entry] = {
    "load": Number(unit="F", above=0, most=1e-6, word="as drawn"),
    "ratio": Number(least=1),
    "count": Integer(least=1),
    "name": Text(),
    "kind": Text(choices=("width", "energy")),
    "cards": Names(),
    "nets": Names(required=True),
}

Read = Callable[[str], Settings]


@pytest.fixture
def read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Read:
    monkeypatch.chdir(tmp_path)

    def reader(text: str) -> Settings:
        data = text.encode()
        Path("b.toml").write_bytes(data)
        return read_settings("b.toml", KEYS)

    return reader


#: Text of the file, and the whole message.
MISTAKES = [
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
            "b.toml:2:9: count must be a whole number, got 1.5 (wrong-type)\n"
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
        'name = "x"\nnets = []',
        "b.toml:2:8: nets must name something (empty-list)\n    nets = []\n           ^^",
    ),
]


class TestMistakes:
    @pytest.mark.parametrize(("text", "message"), MISTAKES)
    def test_whole_message(self, read: Read, text: str, message: str) -> None:
        with pytest.raises(SettingsError) as caught:
            read(f"{text}\n" if "nets" in text else f'{text}\nnets = "z"\n')
        assert str(caught.value) == message

    def test_a_number_beyond_floats(self, read: Read) -> None:
        with pytest.raises(SettingsError, match="ratio must be a number: too large a number"):
            read(f"nets = 'z'\nratio = 1{'0' * 400}")
