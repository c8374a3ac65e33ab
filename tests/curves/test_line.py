"""The fitted line: it passes where the fit says, dense at the jump."""

import numpy as np
import pytest

from server.curves.circumstances import Circumstances, system_named
from server.curves.entrance import analysed
from server.curves.model.line import fitted_line
from server.curves.points import Points


@pytest.mark.parametrize("name", ["khp-naoh", "tris-hcl", "carbonate-hcl"])
def test_fitted_line_passes_through_points_without_scatter(usual, volumes_by_hand, name):
    one = usual[name]
    V = volumes_by_hand(one.effective_mL)
    known = Circumstances(system_named(name), flask_volume_mL=one.V0, amount_mmol=one.n)
    pH = one.pH(V)
    found = analysed(Points("pH", tuple(V), tuple(pH)), known)
    line_V, line_pH = fitted_line(found.fitted.fit)
    assert np.all(np.diff(line_V) >= 0)
    # in the jump a pH of the interpolation stands for little volume: compare along both axes
    off = np.interp(V, line_V, line_pH) - pH
    away = np.abs(V - one.effective_mL) > 0.3
    assert np.abs(off[away]).max() < 0.01
    middle = float(np.interp(one.effective_mL, line_V, line_pH))
    assert middle == pytest.approx(float(one.pH(np.array([one.effective_mL]))[0]), abs=0.1)


def test_fitted_line_bears_the_probes_slope_and_offset(usual, volumes_by_hand):
    one = usual["khp-naoh"]
    V = volumes_by_hand(one.effective_mL)
    known = Circumstances(system_named("khp-naoh"), flask_volume_mL=one.V0, amount_mmol=one.n)
    shown = 7 + 0.05 + 0.97 * (one.pH(V) - 7)
    found = analysed(Points("pH", tuple(V), tuple(shown)), known)
    line_V, line = fitted_line(found.fitted.fit)
    assert float(np.interp(10.0, line_V, line)) == pytest.approx(
        float(np.interp(10.0, V, shown)), abs=0.02
    )
