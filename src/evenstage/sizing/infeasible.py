"""Wishes that no sizes can meet, and which of them is to blame."""

from __future__ import annotations

from evenstage.errors import InfeasibleError
from evenstage.units import engineering


class DelayOutOfReachError(InfeasibleError):
    """No sizes within the limits are as fast as asked.

    Parameters
    ----------
    asked, least : float
        The delay asked for and the least possible one, s.
    """

    def __init__(self, asked: float, least: float) -> None:
        missed = engineering(least - asked, "s")
        super().__init__(
            f"a delay of {engineering(asked, 's', 4)} is out of reach: the least possible with "
            f"these limits is {engineering(least, 's', 4)}, {missed} more",
            code="delay-out-of-reach",
        )
        self.asked = asked
        self.least = least


class BudgetTooSmallError(InfeasibleError):
    """Even the cheapest sizes within the limits cost more than asked.

    Parameters
    ----------
    asked, least : float
        The spend asked for and the least possible one.
    """

    def __init__(self, asked: float, least: float) -> None:
        super().__init__(
            f"a spend of {asked:.6g} is out of reach: the least possible with these limits is "
            f"{least:.6g}",
            code="budget-too-small",
        )
        self.asked = asked
        self.least = least


class LimitOutOfReachError(InfeasibleError):
    """A limit cannot be kept by any sizes, given the other limits.

    Parameters
    ----------
    limit_row : int
        Which one.
    least : float
        The least its sum can be brought to; above 1.
    """

    def __init__(self, limit_row: int, least: float) -> None:
        super().__init__(
            f"limit {limit_row} cannot be kept: no sizes bring it below {least:.4g} times what is "
            "allowed",
            code="limit-out-of-reach",
        )
        self.limit_row = limit_row
        self.least = least
