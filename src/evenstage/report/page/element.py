"""Elements of HTML and SVG as values that write themselves, always the same way."""

from __future__ import annotations

from dataclasses import dataclass
from html import escape


@dataclass(frozen=True, slots=True)
class Element:
    """One element; texts among its children are escaped.

    Parameters
    ----------
    tag : str
    attributes : tuple of (str, str)
    children : tuple of Element or str
    """

    tag: str
    attributes: tuple[tuple[str, str], ...] = ()
    children: tuple[Element | str, ...] = ()

    def __html__(self) -> str:
        """Return the markup, as template engines ask for it."""
        attributes = "".join(f' {name}="{escape(value)}"' for name, value in self.attributes)
        inside = "".join(
            escape(child, quote=False) if isinstance(child, str) else child.__html__()
            for child in self.children
        )
        return f"<{self.tag}{attributes}>{inside}</{self.tag}>"


def element(tag: str, *children: Element | str, **attributes: str | float) -> Element:
    """Return an element; ``class_`` is the class, and other underscores are hyphens."""
    pairs = tuple(
        (
            name.removesuffix("_").replace("_", "-"),
            value if isinstance(value, str) else number(value),
        )
        for name, value in attributes.items()
    )
    return Element(tag, pairs, children)


def number(value: float) -> str:
    """Return a coordinate with at most two decimals.

    Examples
    --------
    >>> number(12.0), number(0.126), number(-0.001)
    ('12', '0.13', '0')
    """
    text = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def share(part: float) -> str:
    """Return a part of one as a percentage of the drawing's width."""
    return f"{number(100 * part)}%"


def text(x: str | float, y: float, words: str, class_: str = "", anchor: str = "") -> Element:
    """Return a text in a drawing; ``anchor`` is ``middle``, ``end`` or nothing."""
    given = {"class_": class_, "text_anchor": anchor}
    return element("text", words, x=x, y=y, **{name: word for name, word in given.items() if word})


def picture(label: str, *children: Element, class_: str = "", **attributes: str | float) -> Element:
    """Return a drawing with its text alternative."""
    return element(
        "svg", *children, role="img", aria_label=label, class_=class_ or "chart", **attributes
    )
