"""What a chart script draws: a curve's numbers packed as base64, ready to be sent."""

import json
from base64 import b64encode
from collections.abc import Sequence
from typing import Any

import numpy as np

from server.drawing.titration.gran import GranDrawn
from server.drawing.titration.told import Drawn, Numbers


def chart_data(
    drawn: Drawn,
    *,
    residuals: Numbers | None,
    slopes: tuple[Numbers, Numbers],
    gran: Sequence[GranDrawn] = (),
) -> str:
    """Return the curve as JSON; ``slopes`` are mid volumes and steepness.

    Arrays are little-endian 4-byte floats in base64 with their ``dtype``: seven digits, more than
    a screen can show, and a tenth of the time of writing them as decimals.
    """
    document: dict[str, Any] = {
        "kind": drawn.kind,
        "points": _pair(drawn.V, drawn.y),
        "aside": sorted(drawn.aside),
        "model": _pair(*drawn.model) if drawn.model else None,
        "slopes": _pair(*slopes),
        "residuals": None if residuals is None else _packed(residuals),
        "marks": [
            {"method": one.method, "volume": one.volume, "u": one.u, "taken": one.taken}
            for one in drawn.marks
        ],
        "gran": [
            {
                "method": one.method,
                "volume": one.volume,
                **_pair(one.V, one.G),
                "intercept": one.intercept,
                "gradient": one.gradient,
            }
            for one in gran
        ],
    }
    return json.dumps(document, allow_nan=False, separators=(",", ":"))


def _pair(x: Numbers, y: Numbers) -> dict[str, Any]:
    return {"x": _packed(x), "y": _packed(y)}


def _packed(values: Numbers) -> dict[str, str]:
    return {"dtype": "f4", "bdata": b64encode(np.asarray(values, "<f4").tobytes()).decode()}
