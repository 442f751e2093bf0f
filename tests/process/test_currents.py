"""Resistance, slope and shape from currents, against published formulas worked out anew."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from evenstage.errors import SettingsError
from evenstage.process import currents, level1
from evenstage.process.read import read_process

if TYPE_CHECKING:
    from collections.abc import Callable
    from pathlib import Path

    from evenstage.process.process import Process, Transistor

    Read = Callable[..., Transistor]

LN2 = math.log(2)


class TestLaws:
    @pytest.mark.parametrize(
        ("v", "alpha", "share"),
        [
            *((0.2, 1.0, 0.1), (0.2, 1.2, 0.1364), (0.2, 1.3, 0.1522), (0.2, 1.5, 0.18)),
            *((0.2, 2.0, 0.2333), (0.25, 1.0, 0.125), (0.25, 1.3, 0.1739), (0.25, 2.0, 0.25)),
        ],
    )
    def test_slope_of_the_alpha_power_law(self, v: float, alpha: float, share: float) -> None:
        """Sakurai and Newton 1990, recomputed by integrating the circuit (5 digits)."""
        assert_allclose(currents.alpha_power_slope(v, alpha), share, rtol=0, atol=5e-5)

    def test_worked_example_of_the_alpha_power_law(self) -> None:
        """V_DD 1.8, V_T 0.45, alpha 1.3, V_D0 0.8, I_D0 1 mA, C 0.1 pF; recomputed."""
        one = currents.from_alpha_power(1e-3, 0.45, 1.3, 0.8, 1.8)
        assert one.slope is not None
        assert one.shape is not None
        for ramp, delay in ((0, 90.0), (36e-12, 96.261), (90e-12, 105.65), (180e-12, 121.30)):
            found = one.r_w * 0.1e-12 + one.slope * ramp
            assert_allclose(found, delay * 1e-12, rtol=1e-4, atol=0)
        assert_allclose(one.shape * one.r_w * 0.1e-12, 251.665e-12, rtol=1e-5, atol=0)

    def test_alpha_of_two_is_the_square_law(self) -> None:
        """Its slope equals Hedenstierna and Jeppson's for every threshold, an identity."""
        for v in (0.1, 0.2, 0.3, 0.4):
            expected = level1.ramp_delay_share(v)
            assert_allclose(currents.alpha_power_slope(v, 2.0), expected, rtol=1e-12, atol=0)

    def test_effective_current_of_level_one_is_half_the_full_one(self) -> None:
        """V_DD 1.8, V_T 0.45, k 0.1 mA/V^2: I_H 81, I_L 10.125, I_ON 91.125 uA (exact)."""
        k, supply, threshold = 1e-4, 1.8, 0.45
        over = supply - threshold
        high = k * (over * supply / 2 - (supply / 2) ** 2 / 2)
        low = k / 2 * (supply / 2 - threshold) ** 2
        assert_allclose((high, low), (81e-6, 10.125e-6), rtol=1e-12, atol=0)
        on = level1.saturation_current(k, 1.0, over)
        assert_allclose(on, 91.125e-6, rtol=1e-12, atol=0)
        one = currents.from_effective_current(high, low, supply)
        assert_allclose(one.r_w, supply / (2 * (on / 2)), rtol=1e-12, atol=0)

    def test_average_resistance_is_near_the_integral(self) -> None:
        """Rabaey et al., equation 3.43: 0.66250 for lambda V_DD 0.15, the integral 0.671886."""
        one = currents.from_saturation_current(1.0, 1.0, 0.15)
        assert_allclose(one.r_w / LN2, 0.75 * (1 - 7 / 9 * 0.15), rtol=1e-12, atol=0)
        assert_allclose(one.r_w / LN2, 0.66250, rtol=0, atol=5e-6)
        exact = quad(lambda v: v / (1 + 0.15 * v), 0.5, 1.0)[0] / 0.5
        assert_allclose(exact, 0.671886, rtol=0, atol=5e-7)
        assert_allclose(one.r_w / LN2, exact, rtol=0.015, atol=0)

    def test_hand_estimate_of_an_inverter(self) -> None:
        """0.69 times 13 kohm/1.5 times 6.1 fF, 36.5 ps, and 31 kohm/4.5 times 6.0 fF, 28.5 ps."""
        for r, ratio, c, delay in ((13e3, 1.5, 6.1e-15, 36.5), (31e3, 4.5, 6.0e-15, 28.5)):
            current = 0.75 * 2.5 / r
            found = currents.from_saturation_current(current, 2.5).r_w / ratio * c
            assert_allclose(found, delay * 1e-12, rtol=0.01, atol=0)


FILE = """
name = "invented"
supply = 1.8
[[transistor]]
models = ["nch"]
polarity = "n"
length = "0.18u"
c_drain = "1n"
{n}
[[transistor]]
models = ["pch"]
polarity = "p"
length = "0.18u"
r_w = "5m"
c_gate = "1.5n"
c_drain = "1n"
"""


@pytest.fixture
def read(tmp_path: Path) -> Read:
    def n_of(*lines: str) -> Transistor:
        path = tmp_path / "p.toml"
        path.write_text(FILE.format(n="\n".join(lines)))
        process: Process = read_process(path)
        return process.first("n")

    return n_of


class TestProcessFile:
    def test_oxide_and_overlap_make_the_gate(self, read: Read) -> None:
        """T_OX 4 nm: 1.554 fF per um of width at L 0.18 um; the drain's overlap counts twice."""
        bare = read("r_w = 2.4e-3", 'tox = "4n"')
        assert_allclose(bare.c_gate, 1.554e-9, rtol=1e-3, atol=0)
        more = read("r_w = 2.4e-3", 'tox = "4n"', 'cgdo = "0.1n"')
        assert_allclose(more.c_gate - bare.c_gate, 0.3e-9, rtol=1e-9, atol=0)

    def test_saturated_current(self, read: Read) -> None:
        one = read('c_gate = "1.5n"', "i_dsat = 600", "lambda = 0.05")
        expected = LN2 * 0.75 * 1.8 / 600 * (1 - 7 / 9 * 0.05 * 1.8)
        assert_allclose(one.r_w, expected, rtol=1e-12, atol=0)
        assert (one.slope, one.shape) == (0.0, 0.0)

    def test_effective_current(self, read: Read) -> None:
        one = read('c_gate = "1.5n"', "i_high = 500", "i_low = 100")
        assert_allclose(one.r_w, 1.8 / 600, rtol=1e-12, atol=0)

    def test_alpha_power_parameters(self, read: Read) -> None:
        lines = ('c_gate = "1.5n"', "i_dsat = 1000", "vto = 0.45", "alpha = 1.3", "v_dsat = 0.8")
        one = read(*lines)
        assert_allclose(one.r_w, 1.8 / 2000, rtol=1e-12, atol=0)
        assert_allclose(one.slope, 0.5 - 0.75 / 2.3, rtol=1e-12, atol=0)
        assert_allclose(one.shape * one.r_w * 0.1e-6, 251.665e-12, rtol=1e-5, atol=0)

    def test_square_law(self, read: Read) -> None:
        """The same as a level-1 card says."""
        one = read('c_gate = "1.5n"', "kp = 170e-6", "vto = 0.45")
        current = 170e-6 / 2 / 0.18e-6 * 1.35**2
        assert_allclose(one.r_w, LN2 * 0.75 * 1.8 / current, rtol=1e-12, atol=0)
        assert_allclose(one.slope, (1 + 2 * 0.25) / 6, rtol=1e-12, atol=0)
        ramp = level1.fall_time_factor(0.25) / (170e-6 / 0.18e-6 * 1.8) / 0.8
        assert_allclose(one.shape * one.r_w, ramp, rtol=1e-12, atol=0)

    def test_what_is_given_counts_more_than_what_follows(self, read: Read) -> None:
        one = read("r_w = 2.4e-3", 'c_gate = "1.5n"', "i_dsat = 1000", 'tox = "4n"', "slope = 0.4")
        assert (one.r_w, one.c_gate, one.slope) == (2.4e-3, 1.5e-9, 0.4)

    @pytest.mark.parametrize(
        ("lines", "message"),
        [
            (('c_gate = "1.5n"', "i_high = 500"), r"i_high comes without i_low"),
            (('c_gate = "1.5n"',), r"r_w is missing in \[\[transistor\]\]; give it, or currents"),
            (("r_w = 2.4e-3",), r"c_gate is missing in \[\[transistor\]\]; give it, or the oxide"),
        ],
    )
    def test_what_is_missing_is_asked_for(
        self, read: Read, lines: tuple[str, ...], message: str
    ) -> None:
        with pytest.raises(SettingsError, match=message):
            read(*lines)
