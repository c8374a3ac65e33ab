"""QR codes as squares on a grid, for whoever draws them."""

from typing import Any

import segno

QUIET_ZONE = 4


def qr_squares(text: str, *, level: str = "q") -> dict[str, Any]:
    """Return the dark runs of a QR code (ISO/IEC 18004) without its quiet zone.

    ``size`` is the number of modules of a side, ``runs`` are row, first column and length.
    ``level`` is the least error correction: a quarter of the code may be lost at ``q``.
    """
    code = segno.make_qr(text, error=level)
    rows = [bytes(row) for row in code.matrix]
    return {
        "size": len(rows),
        "runs": [list(run) for at, row in enumerate(rows) for run in _runs(at, row)],
    }


def _runs(at: int, row: bytes) -> list[tuple[int, int, int]]:
    found, start = [], None
    for column, dark in enumerate([*row, 0]):
        if dark and start is None:
            start = column
        elif not dark and start is not None:
            found.append((at, start, column - start))
            start = None
    return found
