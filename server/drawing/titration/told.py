"""What the pictures of a titration curve are told: plain numbers, and the methods by name."""

from collections.abc import Sequence
from dataclasses import dataclass

from server.drawing.svg import element

Numbers = Sequence[float]


@dataclass(frozen=True, slots=True)
class Marked:
    """A method's equivalence volume in mL with its u; ``taken`` is the one that counts."""

    method: str
    volume: float
    u: float
    taken: bool = False


@dataclass(frozen=True, slots=True)
class Drawn:
    """A curve as it is drawn: points in the order of reading, and what was found on it.

    ``y`` is in pH or mV as ``kind`` says; ``aside`` are the points that count little or nothing;
    ``model`` is the fitted line as volumes and readings; ``marks`` the volumes that were found.
    """

    kind: str
    V: Numbers
    y: Numbers
    aside: frozenset[int]
    model: tuple[Numbers, Numbers] | None
    marks: tuple[Marked, ...]

    @property
    def taken(self) -> Marked | None:
        """The mark that counts."""
        return next((mark for mark in self.marks if mark.taken), None)


#: Each method's shape about a centre, for a size of one: told apart without colour.
_SHAPES = {
    "steepest segment": "M{l} {t}H{r}V{b}H{l}z",
    "first derivative": "M{x} {t}L{r} {b}H{l}z",
    "second derivative": "M{x} {b}L{r} {t}H{l}z",
    "gran acid side": "M{r} {y}L{l} {t}V{b}z",
    "gran alkaline side": "M{l} {y}L{r} {t}V{b}z",
}


_TAKEN = {"fill": "#b0125f", "stroke": "#fffdf8", "class": "chart-taken"}
_OTHER = {"fill": "#fffdf8", "stroke": "currentColor", "class": "chart-other"}


def shape(method: str, x: float, y: float, *, size: float = 4.5, taken: bool = False) -> str:
    """Return the mark of a method about a point; the one that counts is filled with the accent."""
    look = _TAKEN if taken else _OTHER
    size += 1.5 if taken else 0.0
    form = _SHAPES.get(method)
    if form is None:
        return element("circle", {"cx": x, "cy": y, "r": size, **look})
    return element("path", {"d": _outline(form, x, y, size), **look})


def shapes(method: str, places: Sequence[tuple[float, float]], *, size: float) -> str:
    """Return a method's mark at many places as one path."""
    form = _SHAPES.get(method, _SHAPES["steepest segment"])
    return element("path", {"d": "".join(_outline(form, x, y, size) for x, y in places), **_OTHER})


def _outline(form: str, x: float, y: float, size: float) -> str:
    places = {"x": x, "y": y, "l": x - size, "r": x + size, "t": y - size, "b": y + size}
    return form.format(**{name: f"{round(place, 1):g}" for name, place in places.items()})


def method_mark(method: str, *, taken: bool = False) -> str:
    """Return a method's mark alone, silent: its name stands beside it."""
    attributes = {
        "xmlns": "http://www.w3.org/2000/svg",
        "viewBox": "0 0 14 14",
        "width": 14,
        "height": 14,
        "aria-hidden": "true",
        "class": "mark",
    }
    return element("svg", attributes, shape(method, 7, 7, size=4.2, taken=taken))


def volume_words(volume: float) -> str:
    """Return a volume in mL to the last digit that a picture can be asked for."""
    return f"{volume:.3f}"


def slope_words(slope: float) -> str:
    """Return a slope with three digits, or all before the point where it is steep."""
    return f"{slope:.0f}" if abs(slope) >= 100 else f"{slope:.3g}"
