"""The laws of a driver with a wire, against exact responses of random nets."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.circuit.rc_network import RCNetwork
from evenstage.timing.wire_laws import crossing, step_share
from support.wires import Driven, FloatArray, Net, random_tree

LN2 = math.log(2)


@dataclass(frozen=True)
class Case:
    """A driven net, what its wires amount to, and its last node as the sink; ln 2 inside."""

    driven: Driven

    @property
    def moments(self) -> tuple[FloatArray, FloatArray]:
        net = self.driven.net
        held = np.arange(len(net.capacitance)) == 0
        found = RCNetwork(net.ends, net.resistance * LN2, held).moments(net.capacitance)
        return found.first, found.second

    @property
    def elmore(self) -> float:
        return LN2 * self.driven.resistance * float(self.driven.net.capacitance.sum())

    def step(self, node: int) -> float:
        """Return the 50 % delay of a node for a step."""
        w, v = self.moments
        c = self.driven.net.capacitance
        a, b = float(c @ w), float(c @ v)
        near = 1 - a**2 / b / float(c.sum())
        columns = np.array([[self.elmore], [b / a], [near], [w[node]]])
        return float(crossing(*columns)[0])

    def effective(self, transition: float = 0.0) -> float:
        """Return the driver's delay with the effective capacitance."""
        share = float(step_share(np.array(self.elmore**2), np.array(transition)))
        return (1 - share) * self.elmore / LN2 + share * self.step(0)

    def at_sink(self, transition: float = 0.0) -> float:
        w, _ = self.moments
        share = float(step_share(np.array(self.spread() ** 2), np.array(transition)))
        return (1 - share) * (self.elmore + float(w[-1])) / LN2 + share * self.step(-1)

    def spread(self) -> float:
        """Return the sink's deviation: that of the driver and what the wire adds."""
        w, v = self.moments
        a = LN2 * self.driven.resistance * float(self.driven.net.capacitance @ w)
        return math.sqrt(self.elmore**2 + 2 * a + 2 * v[-1] - w[-1] ** 2)


def cases(seed: int, count: int = 90) -> list[Case]:
    """Return random trees with the far load of a gate behind drivers from weak to strong."""
    rng = np.random.default_rng(seed)
    found = []
    for _ in range(count):
        tree = random_tree(rng)
        loaded = tree.capacitance + np.eye(len(tree.capacitance))[-1] * rng.uniform(0, 3)
        driver = tree.resistance.sum() * 10 ** rng.uniform(-1.3, 1.0)
        found.append(Case(Driven(Net(tree.ends, tree.resistance, loaded), float(driver))))
    return found


def percent(estimates: list[float], exact: list[float], scale: list[float]) -> float:
    """Return the 90th percentile of the errors, in percent of a scale."""
    errors = np.abs(np.array(estimates) - np.array(exact)) / np.array(scale)
    return float(np.percentile(100 * errors, 90))


class TestEffectiveCapacitance:
    @pytest.mark.parametrize(("ramp", "most"), [(0.0, 3), (1.0, 3), (3.0, 6)])
    def test_it_gives_the_delay_at_the_driver(self, ramp: float, most: float) -> None:
        """Errors in percent of the delay to the sink; with the whole capacitance they pass 20."""
        some = cases(8417)
        slow = [ramp * case.elmore for case in some]
        exact = [c.driven.delay(0, t) for c, t in zip(some, slow, strict=True)]
        scale = [c.driven.delay(-1, t) for c, t in zip(some, slow, strict=True)]
        found = [c.effective(t) for c, t in zip(some, slow, strict=True)]
        assert percent(found, exact, scale) < most
        if ramp == 0:
            assert percent([c.elmore for c in some], exact, scale) > 20

    def test_two_poles_exactly(self) -> None:
        """A pi is what it says it is: both 50 % points agree with the eigenvalues."""
        rng = np.random.default_rng(27)
        near, lag = rng.uniform(0.01, 0.99, 60), 10 ** rng.uniform(-4, 4, 60)
        one = np.ones(60)
        at_driver, at_far = crossing(one, lag, near, 0 * one), crossing(one, lag, near, lag)
        for k, (c, tau) in enumerate(zip(near.tolist(), lag.tolist(), strict=True)):
            net = Net(np.array([[0], [1]]), np.array([tau / (1 - c)]), np.array([c, 1 - c]))
            exact = [Driven(net, 1.0).delay(node) / LN2 for node in (0, 1)]
            assert_allclose([at_driver[k], at_far[k]], exact, rtol=1e-7, atol=0)

    def test_limits(self) -> None:
        """No wire, nothing near the driver, a far part out of reach, and a far part with no lag."""
        near, lag = np.array([1.0, 0.0, 0.25, 0.5]), np.array([1.0, 1e-12, 1e12, 0.0])
        found = crossing(np.ones(4), lag, near, np.zeros(4))
        assert_allclose(found, [1, 1, 0.25, 1], rtol=1e-6, atol=0)

    def test_without_a_driver_one_pole_is_left(self) -> None:
        nothing, one = np.zeros(2), np.ones(2)
        found = crossing(nothing, one, one / 3, np.array([1.0, 0.0]))
        assert_allclose(found, [1, 0], rtol=1e-12, atol=1e-12)

    def test_more_wire_never_shields_less(self) -> None:
        lags, one = 10 ** np.linspace(-6, 6, 200), np.ones(200)
        for near in (0.0, 0.1, 0.5, 0.9, 1.0):
            found = crossing(one, lags, near * one, 0 * one)
            assert (np.diff(found) <= 1e-12).all()
            assert (found <= 1 + 1e-12).all()
            assert (found >= near - 1e-9).all()

    def test_any_values_are_crossed(self) -> None:
        """The response at the time found is one half, whatever the numbers."""
        rng = np.random.default_rng(61)
        near, lag = rng.uniform(0, 1, 900), 10 ** rng.uniform(-6, 6, 900)
        first = rng.uniform(0, 3, 900) * lag
        time = crossing(np.ones(900), lag, near, first) * LN2
        slow, fast = (
            2 * near * lag / (1 + lag + sign * np.sqrt((1 + lag) ** 2 - 4 * near * lag))
            for sign in (-1, 1)
        )
        weight = (1 - (lag - first) / slow) / (1 - fast / slow)
        left = weight * np.exp(-time / slow) + (1 - weight) * np.exp(-time / fast)
        assert_allclose(left, 0.5, rtol=0, atol=1e-6)


class TestSinks:
    def test_steps(self) -> None:
        """Within 2 %; Elmore times ln 2 is up to 8 % off."""
        some = cases(311)
        exact = [c.driven.delay(-1) for c in some]
        assert percent([c.at_sink() for c in some], exact, exact) < 2
        elmore = [c.elmore + float(c.moments[0][-1]) for c in some]
        assert percent(elmore, exact, exact) > 6

    @pytest.mark.parametrize("ramp", [1.0, 3.0])
    def test_ramps(self, ramp: float) -> None:
        """Within 3 %; the delay of a step errs by up to 16 % at a ramp of three."""
        some = cases(977)
        exact = [c.driven.delay(-1, ramp * c.elmore) for c in some]
        assert percent([c.at_sink(ramp * c.elmore) for c in some], exact, exact) < 3

    def test_transitions(self) -> None:
        """The deviation measures the 10 to 90 % time of a step within 1.5 % of one pole's."""
        some = cases(5003)
        exact = [c.driven.crossing(-1, 0.9) - c.driven.crossing(-1, 0.1) for c in some]
        found = [math.log(9) / LN2 * c.spread() for c in some]
        assert percent(found, exact, exact) < 1.5

    def test_at_the_driver_no_wire_is_left(self) -> None:
        for case in cases(19, 20):
            assert_allclose(case.step(0), case.effective(), rtol=1e-12, atol=0)

    def test_near_sinks(self) -> None:
        """Within 5 % of the delay to the far sink."""
        some = cases(411)
        exact = [c.driven.delay(1) for c in some]
        scale = [c.driven.delay(-1) for c in some]
        assert percent([c.step(1) for c in some], exact, scale) < 5

    def test_no_transition_is_a_step(self) -> None:
        assert_allclose(step_share(np.zeros(1), np.zeros(1)), 1.0, rtol=0, atol=0)
