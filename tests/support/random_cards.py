"""Random cards, right and wrong, in every spelling the netlist language has."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import random

#: Cards whose shapes are learned before the random ones are read.
LESSON = b"""* lesson
m1 d g s b nch
m1 d g s b nch w=1u l=2u
m2 d g s b nch w='2*a' l={x}
m3 d g s b nch w=max(a,b) l=1
x1 a b inv
x2 a b inv w=1u
x3 a b / inv
x4 a b / inv w=1u l='a b'
x5 a b inv params: w=1
r1 a b 1k
r2 a b
r3 a b r=1
c1 a b 'x*2' m=2
c2 a b 1f mod
m4 (d g s b) nch w=1u
m5 d g s b nch off
m6 d g s b nch w=1u off l=2u
m7 d g s b nch off=1
m8 d g s e b nch w=1u
m9 (d g s e b t) nch w=1u off
x6 (a b) inv w=1u
x7 (a b) / inv
r4 (a b) 1k
"""

WORDS = [
    *("a", "b", "VDD", "net:1", "n<3>", "a[0]", "x/y", "/top", "0", "12", "gnd!", "a.b", "n_1"),
    *(
        "params:",
        "/",
        "p:",
        "nch",
        "1k",
        "$x",
        ";y",
        "it's",
        "a$b",
        "a;b",
        "w",
        "$",
        "-",
        "+5",
        "*",
    ),
    *("off", "offset", "//x", "a//b", "(", ")", "(a", "b)"),
    *("a:", ":", "::b", "q::r", "\xe9t\xe9", "\xa0", "\x85x", "a\x0cb"),
]
VALUES = [
    "1u",
    "'a+b'",
    "{2*w}",
    "max(1,2)",
    "0.5",
    "'a $ b'",
    '"s"',
    "1,2",
    "x",
    "",
    "'",
    "(a)",
    "'a;",
    "f(g(1),2)*3",
    "f(1, 2)",
    "(a $ b)",
    "f(1,\n+ 2)",
    "1,w",
]
GAPS = [
    " ",
    "  ",
    "\t",
    " \n+ ",
    "\n+",
    "\r\n  +\t",
    " $ note\n+ ",
    " // note\n+ ",
    "\n//it's\n+//x\n+ ",
    "\n* it's\n\n+ ",
    "\r+",
    "\n+$x\n+ ",
    ",",
    " , ",
    "\n*.x y\n+ ",
]
ENDS = [
    "\n",
    "\r\n",
    "\r",
    " $ end\n",
    " //end\n",
    "// end\n",
    "; end\n",
    " ; it's\n",
    "\n\n",
    "\n* c\n",
    "\n*.GLOBAL g\n+ h\n",
    "\n  $ c\n",
]


def random_card(pick: random.Random) -> str:
    """Return something like a card."""
    words = [pick.choice("mxrcvMXRCd") + str(pick.randrange(9))]
    words += [pick.choice(WORDS) for _ in range(pick.choice([2, 3, 3, 5, 5, 5, 6]))]
    if pick.random() < 0.2:
        words[pick.randrange(1, len(words)) :] = [pick.choice(["/", "params:"]), "inv"]
    for _ in range(pick.choice([0, 1, 2, 2])):
        equals = pick.choice(["=", "=", " = ", "= ", " =", "\n+ ="])
        words.append(pick.choice(["w", "l", "m", "W", "r"]) + equals + pick.choice(VALUES))
    gaps = [pick.choice(GAPS) if pick.random() < 0.2 else " " for _ in words]
    gaps[-1] = pick.choice(ENDS)
    return "".join(word + gap for word, gap in zip(words, gaps, strict=True))


def tame_card(pick: random.Random) -> str:
    """Return a card that is most likely right."""
    nodes = " ".join(pick.choice(WORDS[:13]) for _ in range(pick.choice([4, 4, 4, 5, 6])))
    if pick.random() < 0.2:
        nodes = pick.choice(["(%s)", "( %s )", "(%s)\n+ "]) % nodes
    names = pick.choice(["", "w", "wl", "lw", "wlm", ["w", "off"]])
    pairs = [f"{k}={pick.choice(VALUES[:9])}" for k in names]
    gap = pick.choice(GAPS[:10])
    tail = gap.join(["", *pairs]) + pick.choice(ENDS)
    return (
        pick.choice(
            [
                f"m1 {nodes} nch",
                f"m1 {nodes} nch off",
                f"x1 {nodes} inv",
                f"x1 {nodes} / inv",
                f"x1 {nodes} inv params:",
            ]
        )
        + tail
    )


def mutated(text: str, pick: random.Random) -> str:
    """Return a text with one character changed, put in or taken out."""
    place = pick.randrange(len(text))
    return (
        text[:place]
        + pick.choice(["", " ", "=", "'", "$", "\n", "+", "\r", "(", "/", ":", ",", "{"])
        + text[place + pick.randrange(2) :]
    )


def edited_card(pick: random.Random) -> str:
    """Return a card that was right before one character changed."""
    return mutated(tame_card(pick), pick)


def random_bracket(pick: random.Random) -> str:
    """Return something like a card that opens or closes a definition."""
    words = [pick.choice([".subckt", ".SUBCKT", ".ends", ".subckt", ".Ends", ".subcktx"])]
    words += [pick.choice(WORDS) for _ in range(pick.choice([0, 1, 1, 3, 6]))]
    if pick.random() < 0.1:
        words.append("params:")
    for _ in range(pick.choice([0, 0, 1, 2])):
        words.append(pick.choice(["k", "W", "n.1"]) + pick.choice(["=", " = ", "= ", "\n+ ="]))
        words[-1] += pick.choice(VALUES)
    gaps = [pick.choice(GAPS) if pick.random() < 0.1 else " " for _ in words]
    gaps[-1] = pick.choice(ENDS)
    text = "".join(word + gap for word, gap in zip(words, gaps, strict=True))
    return mutated(text, pick) if pick.random() < 0.2 else text


def few_cards(pick: random.Random) -> str:
    """Return some cards that are most likely right, one behind the other."""
    return "".join(tame_card(pick) for _ in range(3))
