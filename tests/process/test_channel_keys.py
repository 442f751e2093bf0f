"""The keys of a process file that say currents, read and written."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest
from numpy.testing import assert_allclose

from evenstage.errors import SettingsError
from evenstage.process.generic import usual_channel
from evenstage.process.read import read_process
from evenstage.process.write import process_text

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.process.process import Channel

TABLE = """
[[transistor]]
models = "{kind}ch"
polarity = "{kind}"
length = "0.1u"
r_w = 1e-3
c_gate = 1e-9
c_drain = 0.8e-9
{more}
"""


def text(more: str) -> str:
    tables = "".join(TABLE.format(kind=kind, more=more) for kind in "np")
    return f'name = "invented"\nsupply = 1.2\n{tables}'


def channel(folder: Path, more: str) -> Channel:
    path = folder / "process.toml"
    path.write_text(text(more))
    return read_process(path).transistors[0].channel


def refused(folder: Path, more: str) -> SettingsError:
    with pytest.raises(SettingsError) as caught:
        channel(folder, more)
    return caught.value


class TestKeys:
    def test_none_say_nothing(self, tmp_path: Path) -> None:
        assert channel(tmp_path, "").current is None

    def test_sign_of_the_threshold_does_not_count(self, tmp_path: Path) -> None:
        assert channel(tmp_path, "vto = -0.3").threshold == 0.3

    def test_kp_is_a_current_at_full_drive(self, tmp_path: Path) -> None:
        found = channel(tmp_path, 'vto = 0.2\nkp = "100 uA/V^2"')
        # KP/2 W/L (1.2 - 0.2)^2 for W/L of 1 um over 0.1 um.
        assert found.alpha == 2.0
        assert_allclose((found.current or 0.0) * 1e-6, 50e-6 * 10 * 1.0, rtol=1e-12, atol=0)

    def test_source_overlap_is_that_of_the_drain_unless_given(self, tmp_path: Path) -> None:
        assert channel(tmp_path, "cgdo = 2e-10").overlap_source == 2e-10
        assert channel(tmp_path, "cgdo = 2e-10\ncgso = 1e-10").overlap_source == 1e-10

    @pytest.mark.parametrize(
        ("more", "code"),
        [
            ("vto = 1.2", "out-of-range"),
            ("alpha = 2.5", "out-of-range"),
            ("kp = 1e-4", "missing-vto"),
            ("vto = 0.3\nkp = 1e-4\ni_dsat = 500", "two-currents"),
            ("cgdo = 0.9e-9", "out-of-range"),
            ("cgdo = 0.6e-9", "out-of-range"),
        ],
    )
    def test_what_makes_no_sense_is_refused(self, tmp_path: Path, more: str, code: str) -> None:
        assert refused(tmp_path, more).code == code

    def test_are_read_back_as_written(self, tmp_path: Path) -> None:
        more = "vto = 0.3\nalpha = 1.4\ni_dsat = 512.0\nv_dsat = 0.5\nlambda = 0.06\ngamma = 0.2"
        path = tmp_path / "process.toml"
        path.write_text(text(f"{more}\nphi = 0.7\ncgdo = 2e-10\ncgso = 1e-10"))
        first = read_process(path)
        path.write_text(process_text(first))
        again = read_process(path)
        assert [t.channel for t in again.transistors] == [t.channel for t in first.transistors]


class TestUsualChannel:
    def test_fills_in_what_is_missing_and_keeps_the_rest(self, tmp_path: Path) -> None:
        path = tmp_path / "process.toml"
        path.write_text(text("alpha = 2.0"))
        kind = read_process(path).transistors[0]
        found = usual_channel(kind, 1.2)
        assert found.threshold == 0.3
        assert found.alpha == 2.0
        assert found.saturation == pytest.approx(0.9)
        assert found.current is None
        narrow = usual_channel(replace(kind, c_drain=1e-10), 1.2)
        assert narrow.overlap_drain == 1e-10
