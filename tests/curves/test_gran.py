"""Gran lines on both sides, their weights, and what bends them."""

import numpy as np
import pytest

from server.curves.gran import gran_line
from server.curves.jumps import cleaned, jumps
from server.curves.outcome import CannotTell
from server.curves.points import Points, titration_curve


def lines(V, pH, *, V0=50.0, inner=None):
    clean = cleaned(titration_curve(Points("pH", tuple(V), tuple(pH))))
    near = clean.middle(jumps(clean)[-1])
    read = np.asarray(pH)[list(clean.at)]
    return {
        side: gran_line(clean, read, side=side, near_mL=near, flask_volume_mL=V0, inner_mL=inner)
        for side in ("before", "beyond")
    }


def test_gran_strong_acid_with_strong_base_is_exact_on_both_sides():
    # 2 mmol strong acid in 50 mL, 0.1 mol/L strong base, no activities: (V0 + V)[H] = c(Ve - V)
    # before, (V0 + V)[OH] = c(V - Ve) beyond, where the other ion is negligible
    V = np.concatenate([np.arange(0, 19.6, 0.5), np.arange(20.4, 25, 0.4)])
    excess = 0.1 * (V - 20) / (50 + V)
    h = -excess / 2 + np.sqrt(excess**2 / 4 + 10**-13.995)
    found = lines(V, -np.log10(h))
    for line in found.values():
        assert line.end_point.volume_mL == pytest.approx(20.0, abs=2e-4)
    assert "strong in the flask" in found["before"].end_point.says
    assert found["before"].end_point.method == "gran acid side"
    assert found["beyond"].end_point.method == "gran alkaline side"


@pytest.mark.parametrize(
    ("name", "acid_side_within", "alkaline_side_within"),
    [("khp-naoh", 0.1, 0.1), ("tris-hcl", 0.1, 0.1), ("carbonate-hcl", 0.1, 0.2)],
)
def test_gran_of_the_known_systems_lies_near_and_its_u_covers(
    name, acid_side_within, alkaline_side_within, usual, volumes_by_hand
):
    truth = usual[name]
    V = volumes_by_hand(truth.effective_mL)
    pH = truth.pH(V) + np.random.default_rng(1).normal(0, 0.01, V.size)
    inner = truth.effective_mL / 2 if name == "carbonate-hcl" else None
    within = {"gran acid side": acid_side_within, "gran alkaline side": alkaline_side_within}
    for line in lines(V, pH, inner=inner).values():
        off = abs(line.end_point.volume_mL - truth.effective_mL)
        assert off < within[line.end_point.method]
        assert off < 2.5 * line.end_point.u_mL


@pytest.mark.parametrize("carbonate", [0.0, 0.004, 0.008, 0.014])
def test_gran_beyond_covers_what_carbonate_in_the_lye_shifts_unseen(
    carbonate, titration, volumes_by_hand
):
    truth = titration("khp-naoh", 50.0, 2.0, 0.1, f=carbonate)
    steps = (np.arange(0, 24, 0.2), np.arange(0, 24, 0.5), np.arange(0, 30, 1.0))
    for V in (volumes_by_hand(truth.effective_mL), *steps):
        y = truth.pH(V) + np.random.default_rng(2).normal(0, 0.003, V.size)
        beyond = lines(V, y)["beyond"].end_point
        assert abs(beyond.volume_mL - truth.effective_mL) < 2.5 * beyond.u_mL
        assert beyond.u_mL < 0.01 * truth.effective_mL


def test_gran_with_an_acid_as_titrant_has_its_sides_the_other_way_round(usual, volumes_by_hand):
    truth = usual["tris-hcl"]
    V = volumes_by_hand(truth.effective_mL)
    found = lines(V, truth.pH(V))
    assert found["before"].end_point.method == "gran alkaline side"
    assert found["beyond"].end_point.method == "gran acid side"


def test_gran_with_too_few_points_on_a_side_says_so(usual):
    truth = usual["khp-naoh"]
    V = np.array([0.0, 5, 10, 14, 17, 18.5, 19.5, 19.9, 20.1, 20.5, 21])
    with pytest.raises(CannotTell, match="Only 3 points"):
        lines(V, truth.pH(V))


def test_gran_beyond_the_end_point_needs_the_flask_volume(usual, volumes_by_hand):
    truth = usual["khp-naoh"]
    V = volumes_by_hand(truth.effective_mL)
    with pytest.raises(CannotTell, match="needs the volume in the flask"):
        lines(V, truth.pH(V), V0=None)
