"""Buffers by named set, the Nernst slope, a probe's slope and offset."""

import math

import pytest

from server.chemistry.buffers import NoBuffer, buffer_names, buffer_pH, buffer_sets
from server.chemistry.electrode import BufferReading, fit_probe, nernst_slope_mV

# JIS Z 8802:2011 (checked against a copy); R. G. Bates, J. Res. NBS 66A (1962) 179 (from memory)
TABLE = [
    ("JIS Z 8802:2011", "oxalate", 25.0, 1.68), ("JIS Z 8802:2011", "phthalate", 25.0, 4.01),
    ("JIS Z 8802:2011", "phosphate", 25.0, 6.86), ("JIS Z 8802:2011", "borate", 20.0, 9.22),
    ("JIS Z 8802:2011", "carbonate", 35.0, 9.93), ("JIS Z 8802:2011", "borate", 0.0, 9.46),
    ("JIS Z 8802:2011", "phosphate", 50.0, 6.83), ("NBS, Bates 1962", "phthalate", 25.0, 4.008),
    ("NBS, Bates 1962", "phosphate", 25.0, 6.865), ("NBS, Bates 1962", "borax", 25.0, 9.180),
]  # fmt: skip


@pytest.mark.parametrize(("set_name", "buffer", "t", "pH"), TABLE)
def test_buffer_has_the_pH_of_its_table(set_name, buffer, t, pH):
    found = buffer_pH(set_name, buffer, t)
    assert found.pH == pytest.approx(pH, abs=1e-12)
    assert found.source
    assert found.provenance


def test_buffer_between_two_temperatures_lies_on_the_line():
    # JIS Z 8802:2011: borate 9.22 at 20 °C, 9.18 at 25 °C
    assert buffer_pH("JIS Z 8802:2011", "borate", 22.0).pH == pytest.approx(9.204)
    assert buffer_pH("JIS Z 8802:2011", "borate", 22.0).u == pytest.approx(0.005 / math.sqrt(3))


@pytest.mark.parametrize(
    ("set_name", "buffer", "t", "about"),
    [("ours", "borate", 25, "set"), ("NBS, Bates 1962", "borate", 25, "buffer"),
     ("JIS Z 8802:2011", "carbonate", 40, "temperature"),
     ("JIS Z 8802:2011", "borate", 50.1, "temperature")],
)  # fmt: skip
def test_buffer_that_is_in_no_table_is_refused(set_name, buffer, t, about):
    with pytest.raises(NoBuffer) as caught:
        buffer_pH(set_name, buffer, t)
    assert caught.value.about == about


def test_sets_are_named_and_their_columns_as_long_as_their_temperatures():
    for name, held in buffer_sets().items():
        assert buffer_names(name)
        assert all(len(column) == len(held["t_C"]) for column in held["buffers"].values())


@pytest.mark.parametrize(
    # R T ln 10 / F with CODATA's constants
    ("t", "mV"),
    [(15, 57.175), (20, 58.167), (25, 59.159), (30, 60.151)],
)
def test_nernst_slope_is_that_of_the_constants(t, mV):
    assert nernst_slope_mV(float(t)) == pytest.approx(mV, abs=5e-4)


def shown(pH, t, slope, offset):
    return offset - slope * (8.314462618 * (t + 273.15) * math.log(10) / 96485.33212 * 1e3) * (
        pH - 7
    )


def test_fit_finds_slope_and_offset_with_buffers_at_different_temperatures():
    given = [(4.01, 20.0), (6.86, 25.0), (9.14, 30.0)]
    readings = [
        BufferReading(pH=pH, u_pH=0.0, temperature_C=t, mV=shown(pH, t, 0.973, -8.4))
        for pH, t in given
    ]
    fit = fit_probe(readings)
    assert fit.slope_percent == pytest.approx(97.3)
    assert fit.offset_mV == pytest.approx(-8.4)
    assert max(abs(one) for one in fit.residuals_mV) < 1e-9
    assert fit.u_slope_percent == pytest.approx(0.0, abs=1e-9)


def test_u_of_two_buffers_agrees_with_gtc():
    import GTC

    readings = [
        BufferReading(pH=4.01, u_pH=0.01, temperature_C=24.0, mV=170.0),
        BufferReading(pH=9.18, u_pH=0.02, temperature_C=24.0, mV=-126.0),
    ]
    fit = fit_probe(readings, u_mV=0.3, u_temperature_C=0.5)
    t = GTC.ureal(24.0, 0.5)
    k = 1e3 * 8.314462618 * (t + 273.15) * math.log(10) / 96485.33212
    x1 = -k * (GTC.ureal(4.01, 0.01) - 7)
    x2 = -k * (GTC.ureal(9.18, 0.02) - 7)
    y1, y2 = GTC.ureal(170.0, 0.3), GTC.ureal(-126.0, 0.3)
    slope = (y1 - y2) / (x1 - x2)
    offset = y1 - slope * x1
    assert fit.slope_percent == pytest.approx(100 * GTC.value(slope))
    assert fit.u_slope_percent == pytest.approx(100 * GTC.uncertainty(slope), rel=1e-6)
    assert fit.offset_mV == pytest.approx(GTC.value(offset))
    assert fit.u_offset_mV == pytest.approx(GTC.uncertainty(offset), rel=1e-6)


def test_meter_that_shows_pH_gives_the_same_as_one_that_shows_mV():
    pairs = [(4.01, 170.0), (9.18, -126.0)]
    by_mV = fit_probe([BufferReading(pH=pH, u_pH=0, temperature_C=25.0, mV=mV) for pH, mV in pairs])
    k = nernst_slope_mV(25.0)
    by_pH = fit_probe(
        [BufferReading(pH=pH, u_pH=0, temperature_C=25.0, shown_pH=7 - mV / k) for pH, mV in pairs]
    )
    assert by_pH.slope_percent == pytest.approx(by_mV.slope_percent)
    assert by_pH.offset_mV == pytest.approx(by_mV.offset_mV)


def test_buffers_that_disagree_widen_u():
    good = [(4.0, 0.0), (7.0, 0.0), (10.0, 0.0)]
    bent = [(4.0, 3.0), (7.0, -6.0), (10.0, 3.0)]
    fits = [
        fit_probe(
            [
                BufferReading(pH, 0.005, 25.0, mV=shown(pH, 25.0, 1.0, 0.0) + off)
                for pH, off in rows
            ],
            u_mV=0.1,
        )
        for rows in (good, bent)
    ]
    assert fits[1].u_slope_percent > 3 * fits[0].u_slope_percent
    # residuals 3, −6, 3 mV with one degree of freedom: s = √54; Σ(theory − mean)² = 2·(3k)²
    k = nernst_slope_mV(25.0)
    assert fits[1].u_slope_percent == pytest.approx(100 * math.sqrt(54 / (18 * k * k)))
    assert fits[1].u_offset_mV == pytest.approx(math.sqrt(54 / 3))


@pytest.mark.parametrize(
    ("pHs", "says"), [([4.0], "two buffers"), ([6.86, 7.0], "too close together")]
)
def test_too_few_or_too_near_buffers_are_refused(pHs, says):
    with pytest.raises(ValueError, match=says):
        fit_probe([BufferReading(pH, 0.01, 25.0, mV=0.0) for pH in pHs])
