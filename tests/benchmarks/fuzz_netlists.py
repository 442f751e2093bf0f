"""Netlists nobody would write: whatever the bytes, the program answers or says what is wrong.

Run by hand::

    PYTHONPATH=src python tests/benchmarks/fuzz_netlists.py --minutes 10

Every case must end within a time of the processor and within a memory, as a block of devices or as
an error of the program's own family. Cases that end otherwise are printed with the seed that makes
them again.
"""

from __future__ import annotations

import argparse
import random
import resource
import signal
import sys
import time
import traceback
from collections import Counter
from pathlib import Path
from typing import TYPE_CHECKING

from evenstage.errors import EvenstageError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes
from evenstage.netlist.rewriting.edits import rewrite

if TYPE_CHECKING:
    from collections.abc import Callable

SAMPLES = Path(__file__).parents[2] / "sample_netlists"
SECONDS = 30
MEBIBYTES = 3072

WORDS = [
    *(b".subckt", b".ends", b".param", b".include", b".lib", b".endl", b".model", b".global"),
    *(b".option", b".if", b".elseif", b".else", b".endif", b".func", b".end", b".control"),
    *(b"m1", b"x1", b"r1", b"c1", b"v1", b"d1", b"nch", b"pch", b"w=1u", b"l=60n", b"m=2", b"off"),
    *(b"a", b"b", b"vdd", b"vss", b"0", b"inv", b"params:", b"/", b"//", b"$", b";", b"*", b"+"),
    *(b"(", b")", b"{", b"}", b"'", b'"', b"=", b",", b":", b"1e999", b"1e-999", b"-1", b"1meg"),
    *(b"'1/0'", b"{w*2}", b"'a'", b"f(x)", b"2**9**9", b"w='w'", b"l={l}", b"\xff\xfe", b".endc"),
    *(b"\xef\xbb\xbf", b"scale=5n", b"nf=0", b"m='1e300*1e300'", b"subckt", b"simulator", b"\x00"),
]
GAPS = [b" ", b" ", b" ", b"\n", b"\n", b"\n+ ", b"\r\n", b"\t", b"\n* c\n+", b"", b"\r", b"\x0c"]


class SlowError(BaseException):
    """A case took too long."""


def of_bytes(pick: random.Random) -> bytes:
    """Return random bytes, now and then without NULs."""
    data = pick.randbytes(pick.choice([5, 50, 500, 5000]))
    return data.replace(b"\0", b" ") if pick.random() < 0.9 else data


def of_words(pick: random.Random) -> bytes:
    """Return words of the language in any order."""
    count = pick.choice([5, 20, 80, 300])
    return b"".join(pick.choice(WORDS) + pick.choice(GAPS) for _ in range(count))


def mutated(pick: random.Random, samples: list[bytes]) -> bytes:
    """Return a sample with some bytes, words or lines changed, moved or repeated."""
    data = bytearray(pick.choice(samples))
    for _ in range(pick.choice([1, 1, 2, 5, 20])):
        start = pick.randrange(len(data) + 1)
        end = min(len(data), start + pick.choice([0, 1, 1, 3, 20, 200]))
        again = bytes(data[start:end]) * pick.choice([2, 9])
        new = pick.choice([b"", pick.choice(WORDS), pick.choice(GAPS), again])
        if pick.random() < 0.2:
            other = pick.randrange(len(data) + 1)
            new = bytes(data[other : other + pick.choice([5, 50, 500])])
        data[start:end] = new
    return bytes(data)


def grown(pick: random.Random) -> bytes:
    """Return a text that is small, or simple, and means something large."""
    n = pick.choice([3, 30, 300, 3000, 30000])
    return pick.choice(LARGE)(n)


def bomb(n: int) -> bytes:
    """Return levels that each call the next a number of times."""
    calls = b"".join(b"x%d a b s%%d\n" % k for k in range(min(n, 100)))
    levels = b"".join(
        b".subckt s%d a b\n" % i + calls.replace(b"%d", b"%d" % (i + 1)) + b".ends\n"
        for i in range(10)
    )
    return b"* t\n" + levels + b".subckt s10 a b\nm1 a b 0 0 nch w=1u l=1u\n.ends\nx1 a b s0\n"


def parameter_bomb(n: int) -> bytes:
    """Return levels that call the next with two values each."""
    level = b".subckt s%d a b w=1\nx1 a b s%d w='w*2'\nx2 a b s%d w='w*3+1'\n.ends\n"
    levels = b"".join(level % (i, i + 1, i + 1) for i in range(min(n, 60)))
    last = b".subckt s%d a b w=1\nm1 a b 0 0 nch w='w*1u' l=1u\nm2 a b 0 0 nch w=1u l=1u\n.ends\n"
    return b"* t\n" + levels + last % min(n, 60) + b"x1 a b s0\n"


def deep_calls(n: int) -> bytes:
    """Return a long chain of definitions."""
    level = b".subckt s%d a b w=1u\nx1 a b s%d w=w\n.ends\n"
    chain = b"".join(level % (i, i + 1) for i in range(n))
    last = b".subckt s%d a b w=1u\nm1 a b 0 0 nch w=w l=1u\n.ends\n" % n
    return b"* t\n" + chain + last + b"x1 a b s0\n"


LARGE: list[Callable[[int], bytes]] = [
    bomb,
    parameter_bomb,
    deep_calls,
    lambda n: b"* t\n" + b".subckt s a b\n" * n + b".ends\n" * n,
    lambda n: b"* t\n" + b"".join(b".subckt s%d a\n" % i for i in range(n)) + b".ends\n" * n,
    lambda n: b"* t\nm1 a b 0 0 nch l=1u w='" + b"(" * n + b"1u" + b")" * n + b"'\n",
    lambda n: b"* t\nm1 a b 0 0 nch l=1u w='" + b"-" * n + b"1u'\n",
    lambda n: b"* t\nm1 a b 0 0 nch l=1u w='" + b"1+" * n + b"1u'\n",
    lambda n: b"* t\nm1 a b 0 0 nch l=1u w='" + b"1?" * n + b"1u'\n",
    lambda n: b"* t\nm1 a b 0 0 nch l=1u w='" + b"2**" * n + b"1u'\n",
    lambda n: b"* t\nm1 a b 0 0 nch l=1u w='" + b"abs(" * n + b"1u" + b")" * n + b"'\n",
    lambda n: b"* t\nm1 a b 0 0 nch l=1u w=" + b"f(" * n + b"1u" + b")" * n + b"\n",
    lambda n: b"* t\nm1 a b 0 0 nch l=1u w=" + b"9" * n + b"\n",
    lambda n: b"* t\nm1 a b 0 0 nch l=1u w=1e" + b"9" * n + b"\n",
    lambda n: (
        b"* t\n.param "
        + b"".join(b"p%d=p%d " % (i, i + 1) for i in range(n))
        + b"p%d=1u\nm1 a b 0 0 nch w=p0 l=1u\n" % n
    ),
    lambda n: (
        b"* t\n"
        + b"".join(b".func f%d(x) {f%d(x)}\n" % (i, i + 1) for i in range(n))
        + b"m1 a b 0 0 nch w='f0(1u)' l=1u\n"
    ),
    lambda n: b"* t\n" + b".if 1\n" * n + b".endif\n" * n,
    lambda n: b"* t\n" + b".if 0\n" * n + b".endif\n" * n,
    lambda n: b"* t\n" + b"+ a\n" * n,
    lambda n: b"* t\nx1 a" + b"\n+ b" * n + b" s\n",
    lambda n: b"* t\nx1 a" + b" b" * n * 20 + b" s\n",
    lambda n: b"x1 a" + b" b" * n * 20,
    lambda n: b"word " * n * 20,
    lambda n: b"* t\n" + b".lib a\n" * n + b".endl\n" * n,
    lambda n: b"* t\n.control\n" + b"foo\n" * n * 20,
    lambda n: b"* t\n.data\n" + b"foo\n" * n * 20 + b".enddata\n",
    lambda n: b"* t\nm1 a b 0 0 nch w='" + b"a\n+" * n + b"\n",
    lambda n: b"* t\nm1 a b 0 0 nch w={" + b"{" * n + b"\n",
    lambda n: b"* t\nr1 a b " + b"(" * n + b"\n",
    lambda n: b"* t\n.model n nmos (" + b"(" * n + b"\n",
    lambda n: (
        b"* t\n"
        + b"".join(b"r%d a%d a%d 1\n" % (i, i, i + 1) for i in range(n))
        + b"m1 a0 b 0 0 nch w=1u l=1u\n"
    ),
    lambda n: b"* t\n" + b"".join(b"m%d a b 0 0 nch w=q%d l=1u\n" % (i, i) for i in range(n)),
    lambda n: b"* t\nm1 a b 0 0 nch w=1u l=1u m=" + b"9" * min(n, 300) + b"\n",
    lambda n: b"* t\n" + b"$" * n + b"\n" + b"'" * n + b"\n",
    lambda n: b"* t\nm1 a b 0 0 nch w=1u l=1u ic=" + b"1," * n + b"\n",
]


def outcome(data: bytes) -> str:
    """Read and lay out a text; return what came of it."""
    try:
        netlist = read_bytes(data, "fuzz.sp", SAMPLES)
        assert rewrite(netlist, ()) == {}
        for number in range(min(len(netlist), 50)):
            netlist.card(number)
        devices = elaborate(netlist)
    except EvenstageError as error:
        return "refused" if str(error) else "silent"
    return "read" if all(map(str, devices.notices)) else "silent"


def stop(*_: object) -> None:
    """End a case that takes too long."""
    raise SlowError


def tell(line: str) -> None:
    """Write a line at once."""
    sys.stdout.write(line + "\n")
    sys.stdout.flush()


def run(minutes: float, seed: int) -> int:
    """Try cases for some minutes; return how many ended badly."""
    size = MEBIBYTES << 20
    resource.setrlimit(resource.RLIMIT_AS, (size, size))
    signal.signal(signal.SIGVTALRM, stop)
    samples = [path.read_bytes() for path in sorted(SAMPLES.glob("**/*.sp"))]
    makers = {
        "bytes": of_bytes,
        "words": of_words,
        "mutated": lambda pick: mutated(pick, samples),
        "grown": grown,
    }
    counts: Counter[str] = Counter()
    slowest, bad = (0.0, ""), 0
    end = time.monotonic() + 60 * minutes
    while time.monotonic() < end:
        kind = random.Random(seed).choices(list(makers), [3, 4, 8, 1])[0]
        data = makers[kind](random.Random(seed))
        began = time.process_time()
        signal.setitimer(signal.ITIMER_VIRTUAL, SECONDS)
        try:
            result = outcome(data)
        except (Exception, SlowError) as error:  # noqa: BLE001 - whatever it is, it is the finding
            bad += 1
            result = "BAD"
            tell(f"seed {seed} ({kind}, {len(data)} bytes): {error!r}; {data[:90]!r}")
            traceback.print_exc(limit=-4)
        signal.setitimer(signal.ITIMER_VIRTUAL, 0)
        counts[f"{kind} {result}"] += 1
        slowest = max(slowest, (time.process_time() - began, f"seed {seed} {kind} {data[:60]!r}"))
        seed += 1
    tell(str(dict(sorted(counts.items()))))
    tell(f"{sum(counts.values())} cases, {bad} bad; slowest {slowest[0]:.1f} s: {slowest[1]}")
    return bad


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--minutes", type=float, default=10.0)
    parser.add_argument("--seed", type=int, default=1)
    asked = parser.parse_args()
    sys.exit(run(asked.minutes, asked.seed) > 0)
