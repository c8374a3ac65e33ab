"""What the chart script is sent: the same numbers, packed."""

import json
from base64 import b64decode

import numpy as np
import pytest

from server.drawing.titration.chart_data import chart_data
from server.drawing.titration.gran import GranDrawn
from server.drawing.titration.told import Drawn, Marked

V = (0.0, 1.25, 2.5, 21.7881)
Y = (4.03, 4.5, 5.125, 8.6543)
DRAWN = Drawn(
    "pH",
    V,
    Y,
    frozenset({2}),
    ((0.0, 2.0), (4.0, 5.0)),
    (Marked("model fit", 2.1, 0.01, taken=True),),
)


def unpacked(packed):
    assert packed["dtype"] == "f4"
    return np.frombuffer(b64decode(packed["bdata"]), "<f4")


def test_packed_numbers_are_the_curves_to_seven_digits():
    told = json.loads(chart_data(DRAWN, residuals=(0.1, -0.2, 9.0, 0.3), slopes=((1.0,), (2.0,))))
    assert unpacked(told["points"]["x"]) == pytest.approx(V, rel=1e-7)
    assert unpacked(told["points"]["y"]) == pytest.approx(Y, rel=1e-7)
    assert unpacked(told["model"]["y"]) == pytest.approx([4.0, 5.0])
    assert unpacked(told["residuals"]) == pytest.approx([0.1, -0.2, 9.0, 0.3])
    assert told["aside"] == [2]
    assert told["marks"] == [{"method": "model fit", "volume": 2.1, "u": 0.01, "taken": True}]


def test_what_is_not_there_is_null_and_never_left_out():
    bare = Drawn("mV", V, Y, frozenset(), None, ())
    told = json.loads(chart_data(bare, residuals=None, slopes=((), ())))
    assert (told["model"], told["residuals"], told["gran"]) == (None, None, [])


def test_gran_lines_carry_their_two_numbers():
    line = GranDrawn("gran acid side", 20.0, (1.0, 2.0), (1.0, 0.9), 1.1, -0.05)
    (told,) = json.loads(chart_data(DRAWN, residuals=None, slopes=((), ()), gran=[line]))["gran"]
    assert (told["method"], told["intercept"], told["gradient"]) == ("gran acid side", 1.1, -0.05)
