"""The demonstration's curves against the program's own model: two ways to one charge balance."""

from random import Random

import pytest

from server.curves.circumstances import Circumstances, system_named
from server.curves.entrance import analysed
from server.demo.simulated_curve import Flask, curve_text
from server.intake.curve_text import read_curve_text


@pytest.mark.parametrize(
    ("amount", "celsius", "carbonate"), [(1.9, 20.6, 0.003), (2.1, 24.0, 0.0), (1.7, 18.0, 0.006)]
)
def test_simulated_curve_has_its_end_where_the_flask_says(amount, celsius, carbonate):
    flask = Flask(amount, 0.1012, celsius, carbonate)
    points = read_curve_text(curve_text(flask, Random(11))).points()
    known = Circumstances(system_named("khp-naoh"), 50.0, amount, celsius)
    found = analysed(points, known)
    fit = found.outcome("model fit")
    # 0.05 % is what a volume scatter of 2 µL and a pH scatter of 0.004 leave in 34 points
    assert abs(fit.volume_mL / flask.end_mL - 1) < 5e-4
    assert abs(fit.volume_mL - flask.end_mL) < 4 * fit.u_mL
    assert abs(found.to_document()["fit"]["probe_slope"] - flask.slope) < 0.01
