"""SVG made element by element, so that every text is escaped and no style comes from outside.

Nothing here holds a colour: shapes carry class names, and the page's style sheet, light or dark,
gives them theirs.
"""

from xml.etree import ElementTree as ET

from markupsafe import Markup

from railguard.report.visible import visible


def node(tag: str, text: str = "", **attributes: object) -> ET.Element:
    """Return an element. `class_` is `class`; underscores in other names become hyphens."""
    made = ET.Element(tag)
    for name, value in attributes.items():
        made.set(_named(name), _written(value))
    if text:
        made.text = visible(text)
    return made


def _named(name: str) -> str:
    return name if name == "viewBox" else name.rstrip("_").replace("_", "-")


def _written(value: object) -> str:
    if isinstance(value, float):
        return f"{value:.2f}".rstrip("0").rstrip(".")
    return visible(str(value))


def picture(
    width: float, height: float, title: str, kind: str, left: float = 0.0, top: float = 0.0
) -> ET.Element:
    """Return an empty picture that screen readers name by its title."""
    return node(
        "svg",
        viewBox=f"{left:.1f} {top:.1f} {width:.1f} {height:.1f}",
        width=round(width),
        height=round(height),
        class_=kind,
        role="img",
        aria_label=title,
        focusable="false",
    )


def markup(svg: ET.Element) -> Markup:
    """Return the picture as text for a page; the serialiser has escaped it."""
    return Markup(ET.tostring(svg, encoding="unicode", short_empty_elements=True))
