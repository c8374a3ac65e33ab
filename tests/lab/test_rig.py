import pytest

from server.lab.rig import Rig, Span, read_decimals, rig_of


@pytest.mark.parametrize(
    ("kind", "identity", "decimals"),
    [
        ("balance", {"resolution": "0.0001"}, 4),
        ("balance", {"resolution": "0.00001"}, 5),
        ("balance", {"resolution": "1e-4"}, 4),
        ("balance", {"resolution": "1"}, 0),
        ("burette", {"resolution": "0.1"}, 2),
        ("burette", {"resolution": "0.05"}, 2),
        ("burette", {"resolution": "0.001"}, 3),
        ("burette", {"resolution": "0.1", "decimals": "1"}, 1),
        ("thermometer", {"resolution": "0.1"}, 1),
        ("thermometer", {}, None),
        ("thermometer", {"resolution": "coarse"}, None),
        ("thermometer", {"decimals": "²"}, None),
    ],
)
def test_decimals_follow_from_resolution_unless_stated(kind, identity, decimals):
    assert read_decimals(kind, identity) == decimals


def test_rig_without_instruments_binds_nothing():
    assert rig_of(()) == Rig(None, None, None, None, None, None, None)


def test_rig_takes_scales_and_tables_of_the_calibration(sheet_parts):
    an_instrument = sheet_parts["instrument"]
    table = [["20", "0.01"], ["0", "0"], ["5.0", "-0.01"]]
    found = rig_of(
        (
            an_instrument("balance"),
            an_instrument("burette", document={"error_table": table}, identity={"capacity": "25"}),
        )
    )
    assert found.balance == Span("0", "220")
    assert found.balance_table is None
    assert found.burette == Span("0", "25")
    assert found.burette_table == Span("0", "20")
    assert found.burette_decimals is None


def test_rig_capacity_of_the_calibration_goes_before_the_identity(sheet_parts):
    burette = sheet_parts["instrument"]("burette", identity={"capacity": "50"})
    assert rig_of((burette,)).burette == Span("0", "25")


def test_rig_table_that_cannot_be_read_is_left_out(sheet_parts):
    odd = sheet_parts["instrument"]("burette", document={"error_table": [["a", "0"], ["b", "0"]]})
    assert rig_of((odd,)).burette_table is None
