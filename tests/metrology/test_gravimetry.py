"""Volumes by weighing water, against plain arithmetic and against GTC."""

import math

import pytest

from server.metrology.burette_points import evaluate_points
from server.metrology.error_curve import bend_between
from server.metrology.glassware import volume_at_20
from server.metrology.gravimetry import (
    Air,
    Ware,
    WaterWeighing,
    evaluate_run,
    water_density,
    weighed_volume,
)
from server.metrology.propagation import Input

AIR = Air(21.3, 1003.1, 46.0)
GLASS = Ware(glass_expansion=9.9e-6, air_saturated=False)
#: Ten deliveries of a 10 mL pipette: net g as read, °C of the water. Made up for this test.
TEN = [
    (9.9692, 21.4), (9.9705, 21.4), (9.9718, 21.5), (9.9688, 21.5), (9.9711, 21.5),
    (9.9699, 21.6), (9.9723, 21.6), (9.9694, 21.6), (9.9707, 21.7), (9.9690, 21.7),
]  # fmt: skip
WEIGHINGS = [WaterWeighing(net, t, AIR) for net, t in TEN]


def tanaka(t):
    """Density of water, kg/m³: Tanaka et al., Metrologia 38 (2001) 301, constants of Table 1."""
    return 999.97495 * (1 - (t - 3.983035) ** 2 * (t + 301.797) / (522528.9 * (t + 69.34881)))


def moist_air(t, p_hPa, rh):
    """Density of moist air, kg/m³: Picard et al., Metrologia 45 (2008) 149, written out anew."""
    T, p = t + 273.15, 100 * p_hPa
    psv = math.exp(1.2378847e-5 * T * T - 1.9121316e-2 * T + 33.93711047 - 6343.1645 / T)
    xv = rh / 100 * (1.00062 + 3.14e-8 * p + 5.6e-7 * t * t) * psv / p
    z = (
        1
        - p / T
        * (1.58123e-6 - 2.9331e-8 * t + 1.1043e-10 * t**2
           + (5.707e-6 - 2.051e-8 * t) * xv + (1.9898e-4 - 2.376e-6 * t) * xv**2)
        + (p / T) ** 2 * (1.83e-11 - 0.765e-8 * xv**2)
    )  # fmt: skip
    return p * 28.96546e-3 / (z * 8.314472 * T) * (1 - xv * (1 - 18.01528 / 28.96546))


def plain_volume(net_g, t):
    """V20 in mL by ISO 4787, written out anew."""
    rho_w, rho_a = tanaka(t), moist_air(21.3, 1003.1, 46.0)
    return net_g * 1000 / (rho_w - rho_a) * (1 - rho_a / 8000) * (1 - 9.9e-6 * (t - 20))


def test_ten_weighings_of_a_pipette_agree_with_plain_arithmetic():
    run = evaluate_run(WEIGHINGS, GLASS, nominal_mL=10.0)
    plain = [plain_volume(net, t) for net, t in TEN]
    mean = sum(plain) / 10
    s = math.sqrt(sum((one - mean) ** 2 for one in plain) / 9)
    for found, wanted in zip(run.volumes, plain, strict=True):
        assert found.volume_mL == pytest.approx(wanted, rel=1e-9)
        assert found.z_mL_g == pytest.approx(1.00317, abs=1.5e-4)
    assert run.mean_mL == pytest.approx(mean, rel=1e-9)
    assert run.systematic_mL == pytest.approx(mean - 10, rel=1e-6)
    assert run.s_mL == pytest.approx(s, rel=1e-6)
    assert run.cv_percent == pytest.approx(100 * s / mean, rel=1e-6)


def test_budget_of_a_run_agrees_with_gtc():
    import GTC

    stated = {
        "weighing": 0.00012, "balance_errors": 0.00006, "water_temperature": 0.1,
        "air_temperature": 0.3, "air_pressure": 1.0, "air_humidity": 3.0,
        "glass_expansion": 5e-7, "water_density": 4e-6,
    }  # fmt: skip
    run = evaluate_run(
        WEIGHINGS, GLASS, nominal_mL=10.0,
        errors=[Input(name=name, value=0.0, u=u) for name, u in stated.items()],
    )  # fmt: skip
    x = {name: GTC.ureal(0, u) for name, u in stated.items()}
    t_air, p, h = (
        AIR.temperature + x["air_temperature"],
        AIR.pressure + x["air_pressure"],
        AIR.humidity + x["air_humidity"],
    )
    T = t_air + 273.15
    psv = GTC.exp(1.2378847e-5 * T * T - 1.9121316e-2 * T + 33.93711047 - 6343.1645 / T)
    pa = 100 * p
    xv = h / 100 * (1.00062 + 3.14e-8 * pa + 5.6e-7 * t_air * t_air) * psv / pa
    z = (
        1
        - pa / T
        * (1.58123e-6 - 2.9331e-8 * t_air + 1.1043e-10 * t_air**2
           + (5.707e-6 - 2.051e-8 * t_air) * xv + (1.9898e-4 - 2.376e-6 * t_air) * xv**2)
        + (pa / T) ** 2 * (1.83e-11 - 0.765e-8 * xv**2)
    )  # fmt: skip
    rho_a = pa * 28.96546e-3 / (z * 8.314472 * T) * (1 - xv * (1 - 18.01528 / 28.96546))
    total = 0
    for net, t0 in TEN:
        t = t0 + x["water_temperature"]
        rho_w = tanaka(t) * (1 + x["water_density"])
        mass = net + x["weighing"] + x["balance_errors"]
        gamma = 9.9e-6 + x["glass_expansion"]
        total += mass * 1000 / (rho_w - rho_a) * (1 - rho_a / 8000) * (1 - gamma * (t - 20))
    plain = [plain_volume(net, t) for net, t in TEN]
    s = math.sqrt(sum((one - sum(plain) / 10) ** 2 for one in plain) / 9)
    mean = total / 10 + GTC.ureal(0, s / math.sqrt(10), 9)
    assert run.mean_mL == pytest.approx(GTC.value(mean), rel=1e-9)
    assert run.u_mL == pytest.approx(GTC.uncertainty(mean), rel=1e-7)
    assert run.dof == pytest.approx(GTC.dof(mean), rel=1e-6)
    assert sum(line.share_percent for line in run.budget) == pytest.approx(100.0)
    assert {line.name for line in run.budget} == {*stated, "repeatability"}


def test_evaporation_is_added_by_its_minutes_and_counts_in_the_budget():
    ware = Ware(9.9e-6, air_saturated=False, evaporation_g_min=0.0008)
    dry = weighed_volume(WaterWeighing(9.97, 21.4, AIR), GLASS)
    open_ = weighed_volume(WaterWeighing(9.97, 21.4, AIR, minutes=1.5), ware)
    assert open_.evaporated_g == pytest.approx(0.0012)
    assert open_.volume_mL - dry.volume_mL == pytest.approx(0.0012 * dry.z_mL_g, rel=1e-3)
    waited = [WaterWeighing(net, t, AIR, minutes=1.5) for net, t in TEN]
    error = Input(name="evaporation", value=0.0, u=0.0002)
    run = evaluate_run(waited, ware, nominal_mL=10.0, errors=[error])
    line = next(one for one in run.budget if one.name == "evaporation")
    assert line.contribution_mL == pytest.approx(0.0002 * 1.5 * 1.0032, rel=1e-3)


def test_air_saturated_water_is_lighter_by_its_few_parts_per_million():
    saturated = Ware(9.9e-6, air_saturated=True)
    one = WaterWeighing(9.97, 20.0, AIR)
    more = weighed_volume(one, saturated).volume_mL / weighed_volume(one, GLASS).volume_mL - 1
    # Tanaka et al. 2001 (coefficients from memory): -4.612e-3 + 1.06e-4 t = -0.00249 kg/m³ at 20 °C
    assert more == pytest.approx(0.002492 / (998.2067 - 1.18), rel=1e-4)
    assert water_density(20.0, air_saturated=True) < water_density(20.0, air_saturated=False)


def test_one_weighing_needs_a_repeatability_from_elsewhere():
    with pytest.raises(ValueError, match="weigh again"):
        evaluate_run(WEIGHINGS[:1], GLASS, nominal_mL=10.0)
    run = evaluate_run(WEIGHINGS[:1], GLASS, nominal_mL=10.0, repeatability=(0.002, 8.0))
    assert run.u_mL == pytest.approx(0.002)
    assert run.s_mL is None
    assert run.dof == pytest.approx(8.0)


def of_volume(volume):
    """Return the weighing at 20 °C that gives a volume."""
    z = weighed_volume(WaterWeighing(1.0, 20.0, AIR), GLASS).z_mL_g
    net = volume / volume_at_20(1.0, z, glass_expansion=9.9e-6, temperature=20.0)
    return WaterWeighing(net, 20.0, AIR)


def test_curve_of_errors_gives_what_is_added_to_a_reading():
    points = {
        5.0: [of_volume(5.006), of_volume(5.008)],
        10.0: [of_volume(10.011), of_volume(10.009)],
        15.0: [of_volume(14.998), of_volume(15.002)],
        20.0: [of_volume(19.990)],
    }
    curve = evaluate_points(points, GLASS)
    assert [at for at, _ in curve.error_table] == [0.0, 5.0, 10.0, 15.0, 20.0]
    assert [added for _, added in curve.error_table] == pytest.approx(
        [0.0, 0.007, 0.010, 0.0, -0.010], abs=1e-9
    )
    # pooled over three pairs: s² = Σ d²/2 / 3 with d = 0.002, 0.002, 0.004
    assert curve.pooled_s_mL == pytest.approx(math.sqrt((2e-6 + 2e-6 + 8e-6) / 3))
    assert curve.pooled_dof == 3.0
    assert curve.largest_mL == pytest.approx(0.010)
    assert curve.largest_between_mL == pytest.approx(0.020)
    # the point at 10 mL lies 0.0065 above the chord of its neighbours: a quarter of it
    assert curve.interpolation_mL == pytest.approx(0.0065 / 4)
    worst = curve.pooled_s_mL  # of the point weighed once
    assert curve.delivery_u_mL == pytest.approx(math.hypot(worst, 0.0065 / 4 / math.sqrt(3)))


def test_curve_of_errors_without_a_repeated_point_is_refused():
    with pytest.raises(ValueError, match="twice"):
        evaluate_points({5.0: [of_volume(5.0)], 10.0: [of_volume(10.0)]}, GLASS)
    with pytest.raises(ValueError, match="two readings"):
        evaluate_points({5.0: [of_volume(5.0)] * 3}, GLASS)


def test_bend_of_a_parabola_is_what_a_chord_misses():
    # y = x²: midway between two points at distance h the chord misses h²/4
    table = [(float(x), float(x * x)) for x in range(0, 21, 5)]
    assert bend_between(table) == pytest.approx(25 / 4)
    assert bend_between(table[:2]) == 0.0
