"""What a sizing is to achieve."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Fastest:
    """The least worst delay."""


@dataclass(frozen=True, slots=True)
class Cheapest:
    """The least spend whose worst delay is at most `delay` (s)."""

    delay: float


@dataclass(frozen=True, slots=True)
class Budget:
    """The least worst delay whose spend, fixed part included, is at most `spend`."""

    spend: float


Goal = Fastest | Cheapest | Budget
