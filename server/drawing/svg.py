"""SVG text from parts: every attribute and every text is escaped here and nowhere else."""

from collections.abc import Mapping
from html import escape


def element(name: str, attributes: Mapping[str, object], *children: str) -> str:
    """Return one element as text; children are SVG text already, attributes are escaped."""
    written = "".join(f' {key}="{escape(_plain(value))}"' for key, value in attributes.items())
    if not children:
        return f"<{name}{written}/>"
    return f"<{name}{written}>{''.join(children)}</{name}>"


def words(
    text: str, x: float, y: float, *, anchor: str = "start", size: float = 12, kind: str = "soft"
) -> str:
    """Return a text at a point; ``kind`` is the class after ``chart-``."""
    attributes = {
        "x": x,
        "y": y,
        "font-size": size,
        "text-anchor": anchor,
        "fill": "currentColor",
        "class": f"chart-{kind}",
    }
    return element("text", attributes, escape(text))


def picture(width: float, height: float, *, says: str, parts: list[str], kind: str) -> str:
    """Return a whole picture that screen readers read as the sentence ``says``."""
    attributes = {
        "xmlns": "http://www.w3.org/2000/svg",
        "viewBox": f"0 0 {_plain(width)} {_plain(height)}",
        "width": width,
        "height": height,
        "role": "img",
        "aria-label": says,
        "class": f"chart {kind}",
    }
    return element("svg", attributes, element("title", {}, escape(says)), *parts)


def _plain(value: object) -> str:
    """Two decimals are a hundredth of a pixel: more would only make pages longer."""
    if isinstance(value, float):
        return f"{value:.2f}".rstrip("0").rstrip(".")
    return str(value)
