"""How many sizes the calls of a leaf may have."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from evenstage.sizing.copies import shared_sizes
from evenstage.sizing.partition import partition
from support.blocks import circuit_of, inverter
from support.models import handles_of

LEAF = ".subckt inv a y\n" + inverter("", "a", "y", 1, 2) + "\n.ends\n"
PASSED = LEAF.replace("inv a y", "inv a y wn=1u wp=2u").replace("w=1u", "w=wn")
PASSED = PASSED.replace("w=2u", "w=wp")


def labels(factors: list[float], copies: int, leaf: str = LEAF) -> list[int]:
    """Return the label of each call of a chain whose calls are multiplied by some factors."""
    count = len(factors)
    calls = "\n".join(f"x{k} n{k} n{k + 1} inv" for k in range(count))
    circuit = circuit_of(f"* t\n.global vdd vss\n{leaf}.subckt top n0 n{count}\n{calls}\n.ends\n")
    parts = partition(circuit)
    slot_factor = np.array(factors)[parts.of_slot]
    found: list[int] = shared_sizes(parts, handles_of(circuit, parts), slot_factor, copies).tolist()
    return found


class TestSharedSizes:
    def test_as_many_sizes_as_copies_stay(self) -> None:
        assert labels([2.0, 3.0, 2.0, 3.0], 2) == [0, 1, 2, 3]

    def test_sizes_near_each_other_become_one(self) -> None:
        assert labels([2.0, 9.0, 2.2, 8.0], 2) == [0, 1, 0, 1]

    def test_nearness_is_that_of_ratios(self) -> None:
        """1.3 is nearer to 2.0 than 9.0 is to 14.0, in ratio 9.0 is nearer."""
        assert labels([1.3, 2.2, 9.0, 14.0], 3) == [0, 1, 2, 2]

    def test_calls_that_stay_as_drawn_need_no_copy(self) -> None:
        assert labels([1.0, 1.0, 2.0, 3.0], 2) == [0, 1, 2, 3]
        assert labels([1.0, 2.0, 2.1, 3.0], 2) == [0, 1, 1, 3]

    def test_widths_that_calls_can_pass_need_no_copy(self) -> None:
        assert labels([2.0, 3.0, 4.0, 5.0], 1, PASSED) == [0, 1, 2, 3]

    def test_without_copies_nothing_is_left_to_tie(self) -> None:
        assert labels([2.0, 2.0], 0) == [0, 1]

    @given(st.lists(st.floats(0.1, 10), min_size=1, max_size=7), st.integers(1, 3))
    def test_never_more_sizes_than_copies(self, factors: list[float], copies: int) -> None:
        found = labels(factors, copies)
        moved = [f for f in factors if abs(f - 1) > 1e-9]
        changed = {label for label, f in zip(found, factors, strict=True) if abs(f - 1) > 1e-9}
        distinct = len({round(np.log(f) / 1e-4) for f in moved})
        assert len(changed) <= copies or distinct <= copies
        # Equal sizes need no tie; tied ones take the first's label.
        assert all(label <= place for place, label in enumerate(found))

    def test_a_perfect_split_is_found(self) -> None:
        dice = np.random.default_rng(11)
        groups = np.exp(np.repeat([-1.0, 0.5, 2.0], 4) + dice.uniform(-0.05, 0.05, 12))
        order = dice.permutation(12)
        found = np.array(labels(groups[order].tolist(), 3))
        for label in np.unique(found):
            assert len(set((order[found == label] // 4).tolist())) == 1
        assert len(np.unique(found)) == pytest.approx(3)


class TestFamilies:
    """Copies that an earlier run made count with those to come."""

    COPY = "* evenstage: inv -> inv_s1: called by x0\n" + LEAF.replace("inv a", "inv_s1 a")

    def labels(self, factors: dict[str, list[float]], copies: int) -> list[int]:
        """Return the labels of calls of the leaf and of its copy."""
        targets = [leaf for leaf, some in factors.items() for _ in some]
        calls = "\n".join(f"x{k} n{k} n{k + 1} {leaf}" for k, leaf in enumerate(targets))
        cards = f"{LEAF}{self.COPY}.subckt top n0 n{len(targets)}\n{calls}\n.ends\n"
        circuit = circuit_of(f"* t\n.global vdd vss\n{cards}")
        parts = partition(circuit)
        factor = np.array([f for some in factors.values() for f in some])[parts.of_slot]
        found: list[int] = shared_sizes(parts, handles_of(circuit, parts), factor, copies).tolist()
        return found

    def test_what_fits_stays(self) -> None:
        factors = {"inv": [1.0, 2.0, 3.0], "inv_s1": [1.5, 1.5]}
        assert self.labels(factors, 3) == [0, 1, 2, 3, 4]

    def test_the_member_with_most_sizes_gives_way(self) -> None:
        assert self.labels({"inv": [1.0, 2.0, 2.1], "inv_s1": [1.5]}, 2) == [0, 1, 1, 3]
        assert self.labels({"inv": [1.0, 2.0], "inv_s1": [1.5, 2.5, 1.0]}, 2) == [0, 0, 2, 2, 4]

    def test_a_leaf_that_can_have_no_copy_changes_for_all_its_calls(self) -> None:
        assert self.labels({"inv": [1.0, 2.0], "inv_s1": [1.5]}, 1) == [0, 0, 2]
