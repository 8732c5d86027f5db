"""The style sheets: of the page, and of a picture that stands alone."""

from __future__ import annotations

from importlib import resources

from markupsafe import Markup

from optopick.report.svg import element


def template_text(name: str) -> str:
    """The text of a file among the package's templates."""
    return resources.files("optopick.report").joinpath("templates", name).read_text(encoding="utf-8")


def page_styles() -> str:
    """The style sheet of the page and of the pictures in it."""
    return "\n".join(template_text(name) for name in ("palette.css", "page.css", "pictures.css"))


def standalone(svg: str) -> str:
    """A picture with a view box, such as the schematic, as a file of its own: the styles go into it."""
    rules = f"svg {{ background: var(--paper); }}\n{template_text('palette.css')}{template_text('pictures.css')}"
    head, _, rest = svg.partition(">")
    return f"{head}>{element('style', Markup(rules))}{rest}"
