"""Channel currents: the law, its slopes, both ways round."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from evenstage.simulation.channel import Channels, flow
from support.nonlinear import level_1

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray

VOLTS = st.floats(-1.5, 1.5)


def channel(sign: float = 1.0, **constants: float) -> Channels:
    """Return one channel; alpha-power with everything on unless told otherwise."""
    every = {
        "threshold": 0.3,
        "gain": 0.7,
        "alpha": 1.3,
        "knee": 0.8,
        "modulation": 0.1,
        "body": 0.3,
        "phi": 0.7,
    } | constants
    return Channels(np.array([sign]), *(np.array([value]) for value in every.values()))


def at(some: Channels, voltages: FloatArray, rounding: float = 0.02) -> FloatArray:
    """Return current and slopes at drain, gate, source and bulk."""
    return np.array(flow(some, *voltages[:, None], rounding=rounding))[:, 0]


class TestFlow:
    @given(VOLTS, VOLTS, VOLTS, st.sampled_from([1.0, -1.0]))
    def test_slopes_are_those_of_the_current(
        self, d: float, g: float, s: float, sign: float
    ) -> None:
        some, here, step = channel(sign), np.array([d, g, s, -2.0 * sign]), 1e-6
        slopes = at(some, here)[1:]
        for terminal in range(3):
            move = step * np.eye(4)[terminal]
            sides = [at(some, here + way * move)[0] for way in (-1, 1)]
            # Second slopes jump where the transistor turns round or saturates.
            assert_allclose(
                (sides[1] - sides[0]) / (2 * step), slopes[terminal], rtol=1e-4, atol=1e-5
            )

    @given(VOLTS, VOLTS, VOLTS)
    def test_turned_round_carries_the_opposite(self, d: float, g: float, s: float) -> None:
        some = channel()
        forward, back = at(some, np.array([d, g, s, -2.0])), at(some, np.array([s, g, d, -2.0]))
        assert_allclose(forward[0], -back[0], rtol=1e-12, atol=1e-15)
        assert_allclose(forward[[1, 3]], -back[[3, 1]], rtol=1e-9, atol=1e-12)

    @given(VOLTS, VOLTS, VOLTS)
    def test_a_p_channel_mirrors_an_n_channel(self, d: float, g: float, s: float) -> None:
        here = np.array([d, g, s, -2.0])
        n, p = at(channel(), here), at(channel(-1.0), -here)
        assert_allclose(p[0], -n[0], rtol=1e-12, atol=0)
        assert_allclose(p[1:], n[1:], rtol=1e-12, atol=0)

    @given(VOLTS, VOLTS, VOLTS)
    def test_alpha_two_is_level_1(self, d: float, g: float, s: float) -> None:
        some = channel(threshold=0.4, gain=0.5, alpha=2.0, knee=1.0, body=0.0)
        found = at(some, np.array([d, g, s, -2.0]), rounding=1e-5)[0]
        expected = level_1(d, g, s, threshold=0.4, k=1.0, modulation=0.1)
        assert_allclose(found, expected, rtol=1e-4, atol=1e-4)

    def test_source_bias_raises_the_threshold(self) -> None:
        # With body 0.3 and phi 0.7 a bias of 1 V is worth 0.3 (sqrt(1.7) - sqrt(0.7)) = 0.140 V.
        biased = at(channel(modulation=0.0), np.array([2.0, 1.5, 0.0, -1.0]))[0]
        shift = 0.3 * (np.sqrt(1.7) - np.sqrt(0.7))
        plain = channel(threshold=0.3 + shift, modulation=0.0, body=0.0)
        assert_allclose(biased, at(plain, np.array([2.0, 1.5, 0.0, -1.0]))[0], rtol=1e-9, atol=0)

    def test_far_below_threshold_it_is_off_and_finite(self) -> None:
        found = at(channel(), np.array([1e3, -1e3, 0.0, 0.0]))
        assert np.isfinite(found).all()
        assert abs(found[0]) < 1e-60
