"""A few lines that write SVG: elements with everything escaped, numbers kept short."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from markupsafe import Markup, escape

Point = tuple[float, float]
"""Horizontal and vertical position, downward, in the units of the drawing."""


def element(name: str, *children: str, **attributes: str | float | None) -> Markup:
    """An element: plain text among the children is escaped, Markup is taken as it is.

    Attribute names lose a trailing underscore and get hyphens for the others: class_, text_anchor. None leaves one out.
    """
    given = "".join(
        f' {_attribute_name(key)}="{escape(_attribute_text(value))}"'
        for key, value in attributes.items()
        if value is not None
    )
    inner = Markup("").join(children)
    return Markup(f"<{name}{given}>{inner}</{name}>") if inner else Markup(f"<{name}{given}/>")


def _attribute_name(key: str) -> str:
    return key.rstrip("_").replace("_", "-")


def _attribute_text(value: str | float) -> str:
    return value if isinstance(value, str) else short(value)


def short(value: float) -> str:
    """A coordinate with two decimals at most."""
    text = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def percent(share: float) -> str:
    """A share [1] of the picture's width or height as a coordinate."""
    return f"{short(100 * share)}%"


def text(at: tuple[str | float, str | float], words: str, class_: str = "", anchor: str = "start") -> Markup:
    """A line of text from, around or up to a point."""
    return element("text", words, x=at[0], y=at[1], class_=class_ or None, text_anchor=anchor)


def lines(at: Point, words: Sequence[str], class_: str = "", anchor: str = "start", step: float = 18.0) -> Markup:
    """Lines of text below each other, the first at the point."""
    return Markup("").join(text((at[0], at[1] + k * step), line, class_, anchor) for k, line in enumerate(words))


def polyline(points: Iterable[Point], class_: str) -> Markup:
    """An open line through points."""
    path = " ".join(f"{short(x)},{short(y)}" for x, y in points)
    return element("polyline", points=path, class_=class_)


def picture(name: str, described: str, *children: str, **attributes: str | float | None) -> Markup:
    """A whole picture with a name and a description for those who do not see it."""
    told = element("title", name) + (element("desc", described) if described else Markup(""))
    return element("svg", told, *children, xmlns="http://www.w3.org/2000/svg", role="img", **attributes)
