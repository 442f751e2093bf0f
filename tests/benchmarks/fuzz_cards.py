"""The fast way to read cards against the grammar's way, on as many random cards as wanted.

Run by hand::

    PYTHONPATH=src:tests python tests/benchmarks/fuzz_cards.py --cases 1000000

The suite reads 20,000 of them (``tests/netlist/reading/test_shapes.py``). A quarter of the cases
are of three cards, the others of one; half are read in blocks so small that their edges fall
everywhere, and numbers are taken from each of them at once. Differences are printed.
"""

from __future__ import annotations

import argparse
import random
import sys
from collections import Counter

from evenstage.netlist.reading import blocks, cards, stored
from evenstage.netlist.reading import reader as reader_module
from support.random_cards import edited_card, few_cards, random_bracket, random_card, tame_card
from support.two_readings import compare, compare_brackets

MAKERS = (tame_card, few_cards, edited_card, random_card)
LOT = 250
SMALL = 100


def run(cases: int, seed: int) -> int:
    """Compare some cases; return how many are read in two ways."""
    pick = random.Random(seed)
    setattr(reader_module, "_LEARNED_AT", 1)  # noqa: B010 - a constant to all others
    usual = blocks._SIZE, cards._LOT, stored._MANY
    counts: Counter[str] = Counter()
    lot = 0
    while lot * LOT < cases:
        size, least, many = (SMALL, 1, 1) if lot % 2 else usual
        setattr(blocks, "_SIZE", size)  # noqa: B010 - likewise
        setattr(cards, "_LOT", least)  # noqa: B010 - likewise
        setattr(stored, "_MANY", many)  # noqa: B010 - likewise
        make = MAKERS[lot // 2 % len(MAKERS)]
        for kind, tally in (
            (make.__name__, compare([make(pick) for _ in range(LOT)])),
            ("bracket", compare_brackets(random_bracket(pick) for _ in range(LOT // 10))),
        ):
            counts[f"{kind} accepted"] += tally.accepted
            counts[f"{kind} refused"] += tally.refused
            counts["different"] += len(tally.differences)
            sys.stdout.writelines(f"{case!r}\n" for case in tally.differences)
        lot += 1
        if lot % 100 == 0:
            sys.stdout.write(f"{lot * LOT} cases: {dict(sorted(counts.items()))}\n")
            sys.stdout.flush()
    sys.stdout.write(f"{lot * LOT} cases: {dict(sorted(counts.items()))}\n")
    return counts["different"]


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--cases", type=int, default=1_000_000)
    parser.add_argument("--seed", type=int, default=1)
    asked = parser.parse_args()
    sys.exit(run(asked.cases, asked.seed) > 0)
