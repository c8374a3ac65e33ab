"""Marks of states and verdicts: a shape of its own for each meaning, so that colour is second."""

from server.drawing.svg import element

_RING = "M7 1a6 6 0 1 1 0 12a6 6 0 1 1 0-12z"
_SQUARE = "M1.8 1.8h10.4v10.4H1.8z"

_SHAPES: dict[str, tuple[str, str]] = {
    "tick": (_RING, "M4 7.2l2.1 2.1L10.1 5"),
    "warning": ("M7 1.6L13.2 12.6H.8z", "M7 5.6v3.4M7 10.4v1"),
    "cross": ("M4.4 1h5.2L13 4.4v5.2L9.6 13H4.4L1 9.6V4.4z", "M4.7 4.7l4.6 4.6m0-4.6l-4.6 4.6"),
    "past": (_RING, "M7 3.6V7.2l2.6 1.7"),
    "pause": (_SQUARE, "M5.3 4.6v4.8M8.7 4.6v4.8"),
    "barred": (_SQUARE, "M4.6 4.6l4.8 4.8m0-4.8l-4.8 4.8"),
    "empty": (
        "M4.8 1h4.4M5.4 1v3.2L2.6 11.4a1.2 1.2 0 0 0 1.2 1.6h6.4a1.2 1.2 0 0 0 1.2-1.6L8.6 4.2V1",
        "",
    ),
    "unknown": (_RING, "M5.3 5.6a1.75 1.75 0 1 1 2.5 1.55c-.6.3-.8.6-.8 1.25M7 10v.9"),
    "pen": (
        "M2 12l.7-3L9.6 2.1a1.2 1.2 0 0 1 1.7 0l.6.6a1.2 1.2 0 0 1 0 1.7L5 11.3z",
        "M8.4 3.3l2.3 2.3",
    ),
    "forth": ("M1.2 7h8M6.4 3.8L9.6 7l-3.2 3.2", "M12.6 2.4v9.2"),
    "back": ("M12.8 7h-8M7.6 3.8L4.4 7l3.2 3.2", "M1.4 2.4v9.2"),
    "dash": (_RING, "M4.2 7h5.6"),
    "ring": (_RING, ""),
}

_MEANINGS: dict[str, str] = {
    "holds": "tick",
    "in force": "tick",
    "in date": "tick",
    "countersigned": "tick",
    "standing": "tick",
    "look": "warning",
    "check due": "warning",
    "due soon": "warning",
    "fails": "cross",
    "lapsed": "past",
    "held": "pause",
    "pulled": "barred",
    "used up": "empty",
    "unproven": "unknown",
    "not calibrated": "unknown",
    "open": "pen",
    "handed in": "forth",
    "sent back": "back",
    "abandoned": "dash",
    "replaced": "dash",
}


def mark(name: str, *, size: int = 14) -> str:
    """Return the mark of a state or verdict; a word without a shape of its own gets a ring.

    The picture carries the word for screen readers; print the word beside it for eyes.
    """
    outline, inside = _SHAPES[_MEANINGS.get(name, "ring")]
    line = {
        "fill": "none",
        "stroke": "currentColor",
        "stroke-width": 1.6,
        "stroke-linecap": "round",
        "stroke-linejoin": "round",
    }
    drawn = [element("path", {"d": d, **line}) for d in (outline, inside) if d]
    attributes = {
        "xmlns": "http://www.w3.org/2000/svg",
        "viewBox": "0 0 14 14",
        "width": size,
        "height": size,
        "role": "img",
        "aria-label": name,
        "class": "mark",
    }
    return element("svg", attributes, *drawn)
