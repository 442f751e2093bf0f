"""Newton's system against finite differences and dense algebra."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.sizing.kkt import NewtonSystem, SingularError
from evenstage.sizing.programme import Entries, Programme
from support.problems import Term, monomials

N, EXTRA = 45, 3


def programme(seed: int) -> Programme:
    """Return an invented programme: narrow rows, and one too wide to be eliminated."""
    rng = np.random.default_rng(seed)
    rows: list[list[Term]] = []
    for _ in range(12):
        pairs = rng.integers(0, N, (3, 2)).tolist()
        rows.append([(float(rng.uniform(0.1, 1)), a, b) for a, b in pairs if a != b])
        rows[-1].append((0.3, None, int(rng.integers(N))))
    rows.append([(0.01, k, None) for k in range(N)])
    count = len(rows)
    return Programme(
        cost=rng.normal(size=N + EXTRA),
        weight=rng.uniform(size=N),
        lower=np.full(N, -2.0),
        upper=np.full(N, 2.0),
        linear=Entries(
            row=np.arange(count, dtype=np.int32),
            column=(N + np.arange(count) % EXTRA).astype(np.int32),
            value=rng.normal(size=count),
        ),
        constant=rng.normal(size=count),
        terms=monomials(rows, N),
    )


def dense_hessian(p: Programme, z: np.ndarray, price: np.ndarray) -> np.ndarray:
    """Return the Hessian of the Lagrangian by differences of its gradient."""

    def gradient(at: np.ndarray) -> np.ndarray:
        whole = np.zeros(p.variables)
        whole[:N] = p.weight * np.exp(at[:N]) + p.terms.gradient(at[:N], price)
        return whole

    step = 1e-6
    columns = [
        (gradient(z + step * e) - gradient(z - step * e)) / (2 * step) for e in np.eye(p.variables)
    ]
    return np.array(columns)


@pytest.mark.parametrize("seed", [3, 8])
class TestLinearisation:
    def test_jacobian_is_that_of_differences(self, seed: int) -> None:
        p = programme(seed)
        z = np.random.default_rng(seed).normal(size=p.variables)
        system = NewtonSystem(p)
        room = np.ones(p.rows + 2 * N)
        found = system.linearise(z, room, room, 0.0).jacobian.toarray()
        step = 1e-6
        expected = [
            (p.constraints(z + step * e) - p.constraints(z - step * e)) / (2 * step)
            for e in np.eye(p.variables)
        ]
        assert_allclose(found, np.array(expected).T, rtol=1e-6, atol=1e-7)

    def test_solves_what_dense_algebra_solves(self, seed: int) -> None:
        p, rng = programme(seed), np.random.default_rng(seed)
        z, tie = 0.5 * rng.normal(size=p.variables), 0.1
        room, price = rng.uniform(0.5, 2, (2, p.rows + 2 * N))
        here = NewtonSystem(p).linearise(z, room, price, tie)
        assert np.count_nonzero(~here.narrow) == 1
        theta = price / room
        jacobian = here.jacobian.toarray()
        bounds = theta[p.rows : p.rows + N] + theta[p.rows + N :] + tie
        matrix = dense_hessian(p, z, price[: p.rows])
        matrix += np.diag(np.append(bounds, np.zeros(EXTRA)))
        matrix += jacobian.T @ np.diag(theta[: p.rows]) @ jacobian
        right, push = rng.normal(size=p.variables), rng.normal(size=p.rows)
        expected = np.linalg.solve(matrix, right - jacobian.T @ push)
        assert_allclose(here.solve(right, push), expected, rtol=1e-5, atol=1e-6)

    def test_refuses_what_has_no_factors(self, seed: int) -> None:
        p = programme(seed)
        nothing = np.zeros(p.rows + 2 * N)
        with (
            pytest.raises(SingularError),
            np.errstate(divide="ignore", invalid="ignore"),
        ):
            NewtonSystem(p).linearise(np.zeros(p.variables), nothing + 1.0, nothing, 0.0)
