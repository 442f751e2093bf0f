"""The exact sizes of a chain with fixed side loads, by shooting.

For delays ``(x_{i+1} + s_i) / x_i + p`` the derivative in ``log x_i`` vanishes where the part of
the load of stage i-1 that is sized, over its own size, equals the whole load of stage i over its
own:

    x_i / x_{i-1} = (x_{i+1} + s_i) / x_i

So the size of the second stage decides all others; it is found by bisection on the load at the end.
"""

from __future__ import annotations


def shot_sizes(first: float, side_load: list[float], last: float) -> list[float]:
    """Return the sizes from `first` to the last stage; `side_load` has one entry per stage."""
    low, high = 0.0, max(first, last, *side_load) * 10.0
    for _ in range(200):
        middle = (low + high) / 2
        sizes = _march(first, middle, side_load)
        low, high = (middle, high) if sizes[-1] < last else (low, middle)
    return _march(first, high, side_load)[:-1]


def _march(first: float, second: float, side_load: list[float]) -> list[float]:
    """Return all sizes and the load at the end; zeros once no positive size is left."""
    sizes = [first, second]
    for side in side_load[1:]:
        before, here = sizes[-2:]
        sizes.append(max(here * here / before - side, 0.0) if here > 0.0 else 0.0)
    return sizes
