"""Process files."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

import pytest

from evenstage.errors import SettingsError
from evenstage.process.process import Junction, Junctions, Process, Transistor
from evenstage.process.read import read_process

LEAST = """\
name = "invented"
supply = 1.8
[[transistor]]
models = ["nx*"]
polarity = "n"
length = "0.18 um"
r_w = "2 kohm*um"
c_gate = "1.4 fF/um"
c_drain = 1e-9
[[transistor]]
models = "px18"
polarity = "p"
length = 180e-9
r_w = 4.4e-3
c_gate = "1.4n"
c_drain = "1n"
"""

MOST = """\
r_fixed = "50"
stack = 0.6
c_gate_fixed = "0.1f"
c_drain_fixed = "0.2f"
c_drain_area = "0.9 mF/m^2"
c_drain_edge = "0.2 fF/um"
c_drain_overlap = "0.5n"
slope = 0.3
slope_power = 0.7
shape = 1.8
shape_carry = 0.2
width_parameter = "WF"
width_is = "finger"
fingers_parameter = "NF"
width_unit = "1u"
width_min = "0.22u"
width_max = "100u"
width_step = "10n"
finger_width_max = "5u"
"""

Read = Callable[[str], Process]


@pytest.fixture
def read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Read:
    monkeypatch.chdir(tmp_path)

    def reader(text: str) -> Process:
        Path("p.toml").write_bytes(text.encode())
        return read_process("p.toml")

    return reader


def without_names(transistor: Transistor) -> dict[str, object]:
    names = (name for name in Transistor.__slots__ if name != "models")
    return {name: getattr(transistor, name) for name in names}


SAMPLES = sorted((Path(__file__).parents[2] / "sample_netlists").glob("*/process.toml"))


class TestReadProcess:
    @pytest.mark.parametrize("path", SAMPLES, ids=lambda path: path.parent.name)
    def test_samples(self, path: Path) -> None:
        process = read_process(path)
        assert process.name.startswith("invented")
        assert all(transistor.width_min for transistor in process.transistors)

    def test_required_keys_only(self, read: Read) -> None:
        process = read(LEAST)
        assert (process.name, process.supply, process.origin) == ("invented", 1.8, "file")
        assert (process.unit_width, process.unit_ratio) == (None, None)
        assert without_names(process.first("n")) == without_names(
            Transistor(
                models=(), polarity="n", length=180e-9, r_w=2e-3, c_gate=1.4e-9, c_drain=1e-9
            )
        )
        assert [process.type_of(name) for name in ("NX18", "px18", "nch")] == [0, 1, None]

    def test_every_key(self, read: Read) -> None:
        process = read("unit_width = '0.42u'\nunit_ratio = 2.5\n" + LEAST + MOST)
        assert (process.unit_width, process.unit_ratio) == (0.42e-6, 2.5)
        junction = Junction(area=0.9e-3, edge=0.2e-9, overlap=0.5e-9)
        assert without_names(process.first("p")) == without_names(
            Transistor(
                models=(),
                polarity="p",
                length=180e-9,
                r_w=4.4e-3,
                c_gate=1.4e-9,
                c_drain=1e-9,
                r_fixed=50.0,
                stack=0.6,
                c_gate_fixed=0.1e-15,
                c_drain_fixed=0.2e-15,
                junctions=Junctions(rise=junction, fall=junction),
                slope=0.3,
                slope_power=0.7,
                shape=1.8,
                shape_carry=0.2,
                width_parameter="wf",
                width_is="finger",
                width_is_said=True,
                fingers_parameter="nf",
                width_unit=1e-6,
                width_min=0.22e-6,
                width_max=100e-6,
                width_step=10e-9,
                finger_width_max=5e-6,
            )
        )

    def test_width_unit_auto_is_none(self, read: Read) -> None:
        assert read(LEAST + 'width_unit = "auto"\n').first("p").width_unit is None

    @pytest.mark.parametrize(
        ("old", "new", "message"),
        [
            (
                'polarity = "p"',
                'polarity = "n"',
                (
                    'p.toml:3:1: no [[transistor]] has the polarity "p" (missing-polarity)\n'
                    "    [[transistor]]\n"
                    "    ^^^^^^^^^^^^^^"
                ),
            ),
            (
                "r_w = 4.4e-3",
                "r_w = 4400",
                (
                    "p.toml:14:7: transistor.r_w must be above 0 ohm*m and at most 10 ohm*m,"
                    " got 4.4 kohm*m (out-of-range)\n"
                    "    r_w = 4400\n"
                    "          ^^^^"
                ),
            ),
            (
                "r_w = 4.4e-3",
                "r_wide = 4.4e-3",
                (
                    "p.toml:14:1: unknown key transistor.r_wide; the nearest known one is r_w"
                    " (unknown-key)\n"
                    "    r_wide = 4.4e-3\n"
                    "    ^^^^^^"
                ),
            ),
            (
                "r_w = 4.4e-3\n",
                "",
                (
                    "p.toml:10:1: r_w is missing in [[transistor]]; give it, or currents: i_dsat, "
                    "i_high and i_low, or kp with vto (missing-key)\n"
                    "    [[transistor]]\n"
                    "    ^^^^^^^^^^^^^^"
                ),
            ),
            (
                'polarity = "p"',
                'polarity = "pmos"',
                (
                    'p.toml:12:13: transistor.polarity must be "n" or "p", got "pmos"'
                    " (bad-choice)\n"
                    '    polarity = "pmos"\n'
                    "                ^^^^"
                ),
            ),
            (
                'c_drain = "1n"',
                'c_drain = "1n"\nwidth_min = "2u"\nwidth_max = "1u"',
                (
                    "p.toml:18:14: width_max is below width_min (limits-crossed)\n"
                    '    width_max = "1u"\n'
                    "                 ^^"
                ),
            ),
            (
                'c_drain = "1n"',
                'c_drain = "1n"\nc_drain_edge = "0.2n"',
                (
                    "p.toml:17:17: c_drain_edge comes without c_drain_area; give both (0 where it"
                    " counts for nothing), or neither (half-given)\n"
                    '    c_drain_edge = "0.2n"\n'
                    "                    ^^^^"
                ),
            ),
            (
                'c_drain = "1n"',
                'c_drain = "1n"\nshape_carry = 1',
                (
                    "p.toml:17:15: transistor.shape_carry must be at least 0 and below 1, got 1"
                    " (out-of-range)\n"
                    "    shape_carry = 1\n"
                    "                  ^"
                ),
            ),
        ],
    )
    def test_whole_message(self, read: Read, old: str, new: str, message: str) -> None:
        with pytest.raises(SettingsError) as caught:
            read(LEAST.replace(old, new))
        shown = re.sub(r"\nknown here: .*", "", str(caught.value))
        assert shown == message
