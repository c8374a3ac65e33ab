"""Labels to print on: single ones, and sheets of A4 or Letter with a grid of them.

The measures of the sheets are those of common self-adhesive stock, from memory: print a test sheet
on plain paper first.
"""

from collections.abc import Mapping
from dataclasses import dataclass

from server.lab.refusal import Unacceptable

A4 = ("A4", 210.0, 297.0)
LETTER = ("Letter", 215.9, 279.4)
_LEAST, _MOST = (40.0, 25.0), (210.0, 297.0)


@dataclass(frozen=True, slots=True)
class Stock:
    """A page of labels; all in mm. ``left`` and ``top`` lead to the first, gaps to the next."""

    name: str
    page_width: float
    page_height: float
    columns: int
    rows: int
    width: float
    height: float
    left: float = 0.0
    top: float = 0.0
    gap_x: float = 0.0
    gap_y: float = 0.0

    @property
    def places(self) -> int:
        """How many labels a page has."""
        return self.columns * self.rows

    def corner(self, place: int) -> tuple[float, float]:
        """Return the upper left corner of a place, counted row by row from 0."""
        row, column = divmod(place, self.columns)
        return (
            self.left + column * (self.width + self.gap_x),
            self.top + row * (self.height + self.gap_y),
        )


def single(width: float, height: float) -> Stock:
    """Return a single label of a size in mm.

    Raises:
        Unacceptable: it is smaller than 40 by 25 mm or larger than A4.
    """
    if not (_LEAST[0] <= width <= _MOST[0] and _LEAST[1] <= height <= _MOST[1]):
        says = "A label is from 40 mm by 25 mm to 210 mm by 297 mm."
        raise Unacceptable(says, field="size", example="100 by 50")
    return Stock(f"one label, {width:g} × {height:g} mm", width, height, 1, 1, width, height)


def _sheet(
    columns: int,
    rows: int,
    size: tuple[float, float],
    *,
    gap_x: float = 0.0,
    paper: tuple[str, float, float] = A4,
) -> Stock:
    width, height = size
    name, page_width, page_height = paper
    across = columns * width + (columns - 1) * gap_x
    return Stock(
        name=f"{name}, {columns * rows} labels of {width:g} × {height:g} mm",
        page_width=page_width,
        page_height=page_height,
        columns=columns,
        rows=rows,
        width=width,
        height=height,
        left=round((page_width - across) / 2, 3),
        top=round((page_height - rows * height) / 2, 3),
        gap_x=gap_x,
    )


SHEETS: Mapping[str, Stock] = {
    "a4-8": _sheet(2, 4, (99.1, 67.7), gap_x=2.5),
    "a4-12": _sheet(2, 6, (99.1, 42.3), gap_x=2.5),
    "a4-14": _sheet(2, 7, (99.1, 38.1), gap_x=2.5),
    "a4-21": _sheet(3, 7, (63.5, 38.1), gap_x=2.55),
    "letter-10": _sheet(2, 5, (101.6, 50.8), gap_x=4.8, paper=LETTER),
}


def find_stock(name: str) -> Stock:
    """Return the sheet of a name, or a single label for a size like ``100x50``.

    Raises:
        Unacceptable: there is no such sheet, and it is no size.
    """
    if name in SHEETS:
        return SHEETS[name]
    width, _, height = name.partition("x")
    try:
        return single(float(width), float(height))
    except ValueError as problem:
        says = f"“{name[:40]}” is no label; it is one of {', '.join(SHEETS)}, or a size in mm."
        raise Unacceptable(says, field="stock", example="100x50") from problem
