"""Calibrations done here: kept with every reading, by version, and refused by their place."""

import pytest
from sqlalchemy import select

from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.procedures.calibration_runs import RecordRun, StateClass, record_run, state_class
from server.procedures.holds import HoldThing, hold_thing
from server.procedures.instrument_log import SetLimits, WriteCheck, set_limits, write_check
from server.procedures.instruments import RegisterInstrument, register_instrument
from server.records.queries.load_sheet import load_sheet_facts
from server.records.tables.stores import Calibration

AIR = {"temperature": "21.3", "pressure": "1003.1", "humidity": "46"}
#: Made up for these tests: a piston burette that delivers 12 µL too much at 20 mL.
RUN = {
    "kind": "piston burette", "nominal": "25", "water": "degassed", "glass_expansion": "9.9e-6",
    "air": AIR,
    "weighings": [
        {"point": point, "before": "20.0000", "after": after, "water": "20.0"}
        for point, after in (
            ("10.00", "29.9720"), ("10.00", "29.9722"), ("20.00", "39.9550"),
            ("20.00", "39.9554"), ("25.00", "44.9350"), ("25.00", "44.9352"),
        )
    ],
}  # fmt: skip
PAPERS = {"done_on": "2026-05-04", "due_on": "2026-11-03", "due_basis": "6 months, own plan"}
SLOW_PROBE = {
    "set": "JIS Z 8802:2011",
    "buffers": [
        {"buffer": "phthalate", "temperature": "25", "mV": "157.0"},
        {"buffer": "phosphate", "temperature": "25", "mV": "0.2"},
    ],
}  # 93 % of Nernst


def run(lab, instrument="", *, who="keeper", **given):
    usual = {"instrument_id": instrument or lab.burette, "run": RUN, "balance_id": lab.balance,
             "thermometer_id": lab.thermometer}  # fmt: skip
    return lab.act(record_run, RecordRun(**usual | PAPERS | given), who)


def calibration(lab, key):
    return lab.transactions.read(lambda session: session.get(Calibration, key))


def register(lab, kind, name):
    command = RegisterInstrument(kind, name, "Holm", "example", "17", "Bench 1")
    return lab.act(register_instrument, command, "keeper")


def test_run_is_kept_as_typed_beside_what_it_states(lab):
    made = calibration(lab, run(lab))
    assert made.version == 2
    assert made.certificate_number == "R-2026-0001"
    assert made.issuer == "own calibration"
    assert made.run["typed"] == RUN
    assert [one["name"] for one in made.run["used"]] == ["Balance B-1", "Thermometer T-1"]
    assert made.run["used"][0]["version"] == 1
    assert made.run["verdict"] == max(
        (one["verdict"] for one in made.run["checks"]), key=["holds", "look", "fails"].index
    )
    table = [[float(cell) for cell in row] for row in made.document["error_table"]]
    assert [row[0] for row in table] == [0, 10, 20, 25]
    assert table[2][1] == pytest.approx(0.0118, abs=2e-4)
    assert lab.acts()[-1] == ("Nils Obermark", "calibrated an instrument", "instrument")
    assert lab.chain().holds


def test_run_numbers_rise_and_a_number_that_was_typed_stays(lab):
    run(lab)
    assert calibration(lab, run(lab)).certificate_number == "R-2026-0002"
    assert calibration(lab, run(lab, certificate_number="TB-7")).certificate_number == "TB-7"


def test_sheet_that_was_begun_keeps_the_older_version(sqlite_lab):
    lab = sqlite_lab
    before = lab.facts().instrument("burette")
    run(lab)
    after = lab.facts().instrument("burette")
    assert (after.version, after.document) == (before.version, before.document)
    new = (
        lab.transactions.read(lambda session: load_sheet_facts(session, sheet))
        if (sheet := lab.begin())
        else None
    )
    assert new.instrument("burette").version == 2
    assert new.instrument("burette").document["error_table"][-1][0] == "25"


def test_standardization_after_a_run_moves_by_its_table_and_the_older_certificate_stays(sqlite_lab):
    lab = sqlite_lab
    lab.certify()
    old = lab.facts()
    run(lab)
    sheet = lab.begin()
    lab.write_lines([(0, "step:mixed", "done"), (0, "indicator", "phenolphthalein"),
                     (0, "temperature", "20.4"), (1, "container_and_standard", "60.4084"),
                     (1, "container_less_standard", "60.0000"), (1, "burette_start", "0.00"),
                     (1, "burette_end", "20.00")], sheet=sheet)  # fmt: skip
    table = {row[0]: float(row[1]) for row in lab.facts(sheet).instrument("burette").document[
        "error_table"]}  # fmt: skip
    moved = lab.evaluate(sheet).result["replicates"][0]["volume_mL"]
    plain = old.evaluation.result["replicates"][0]["volume_mL"]
    # both read 0.00 to 20.00 at 20.4 °C: only the table lies between them
    assert moved / plain == pytest.approx((20.0 + table["20"]) / 20.0, rel=1e-9)
    assert lab.facts().evaluation == old.evaluation


def test_run_that_fails_asks_for_a_reason_and_tells_it(sqlite_lab):
    lab = sqlite_lab
    probe = register(lab, "probe", "Probe E-1")
    given = {"run": SLOW_PROBE, "balance_id": "", "thermometer_id": ""}
    with pytest.raises(Unacceptable, match="probe slope") as refused:
        run(lab, probe, **given)
    assert refused.value.field == "reason"
    made = calibration(lab, run(lab, probe, reason="the new one comes on Friday", **given))
    assert made.run["verdict"] == "fails"
    assert made.run["reason"] == "the new one comes on Friday"
    assert float(made.document["slope_percent"]) == pytest.approx(93.0, abs=0.1)


@pytest.mark.parametrize("who", ["analyst", "countersigner", "steward", "reader"])
def test_run_and_class_are_a_keepers_act(shared_lab, who):
    with pytest.raises(NotAllowed):
        run(shared_lab, who=who)
    with pytest.raises(NotAllowed):
        shared_lab.act(state_class, StateClass(shared_lab.burette, "25", **PAPERS), who)


def test_balance_that_failed_its_last_check_is_not_weighed_with(sqlite_lab):
    lab = sqlite_lab
    limits = {"name": "100 g", "centre": "100.0000", "warning": "0.0002", "action": "0.0003"}
    lab.act(set_limits, SetLimits(lab.balance, limits), "keeper")
    lab.act(write_check, WriteCheck(lab.balance, reading="100.0009"), "analyst")
    lab.clock.move(minutes=1)
    with pytest.raises(Unacceptable, match=r"100.0009 g is .* Weigh with another one") as refused:
        run(lab)
    assert refused.value.field == "balance_id"


def test_balance_that_is_held_or_lapsed_is_not_weighed_with(sqlite_lab):
    lab = sqlite_lab
    lab.act(hold_thing, HoldThing("instrument", lab.balance, "dropped"), "analyst")
    with pytest.raises(Unacceptable, match="is held: dropped") as refused:
        run(lab)
    assert refused.value.field == "balance_id"
    lab.clock.move(days=365)
    papers = {"done_on": "2027-05-01", "due_on": "2027-11-03"}
    with pytest.raises(Unacceptable, match="it has lapsed") as refused:
        run(lab, balance_id="", **papers)
    assert refused.value.field == "thermometer_id"


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"run": RUN | {"nominal": "x"}}, "nominal"),
        ({"run": RUN | {"kind": "beaker"}}, "kind"),
        ({"run": RUN | {"weighings": [{"point": "30", "net": "9", "water": "20"}]}},
         "weighings[0].net"),
        ({"run": []}, "run"),
        ({"balance_id": "x"}, "balance_id"),
        ({"balance_id": "{thermometer}"}, "balance_id"),
        ({"done_on": "2026-05-05"}, "done_on"),
        ({"due_on": ""}, "due_on"),
        ({"due_basis": ""}, "due_basis"),
        ({"certificate_number": "a\0b"}, "certificate_number"),
        ({"reason": "x" * 1001}, "reason"),
    ],
)  # fmt: skip
def test_odd_run_is_refused_by_field(shared_lab, given, field):
    filled = {
        key: shared_lab.thermometer if value == "{thermometer}" else value
        for key, value in given.items()
    }
    if field == "weighings[0].net":
        # the balance has no table here: a net mass is taken, and the point lies above the scale
        field = "weighings[0].point"
    with pytest.raises(Unacceptable) as refused:
        run(shared_lab, **filled)
    assert refused.value.field == field


def test_run_of_an_unknown_instrument_and_of_a_room_monitor_is_refused(sqlite_lab):
    with pytest.raises(NotFound):
        run(sqlite_lab, "none")
    room = register(sqlite_lab, "room monitor", "Room R-1")
    with pytest.raises(Unacceptable, match="elsewhere"):
        run(sqlite_lab, room, balance_id="", thermometer_id="")
    probe = register(sqlite_lab, "probe", "Probe E-1")
    with pytest.raises(Unacceptable, match="not weighed") as refused:
        run(sqlite_lab, probe, run=SLOW_PROBE)
    assert refused.value.field == "balance_id"


def test_class_tolerance_serves_and_says_so(lab):
    flask = register(lab, "flask", "Flask F-1")
    command = StateClass(flask, "100", grade="A", glass_expansion="9.9e-6", **PAPERS)
    made = calibration(lab, lab.act(state_class, command, "keeper"))
    # ISO 1042:1998, 100 mL class A: ± 0.1 mL
    assert made.document["volume"] == {
        "value": "100", "unit": "mL", "half_width": "0.1", "shape": "triangular",
        "source": "tolerance of ISO 1042:1998 class A, 100 mL, no gravimetric run",
    }  # fmt: skip
    assert made.run is None
    assert made.certificate_number == "class A, 100 mL"
    assert lab.acts()[-1][1] == "let a class tolerance serve"


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"nominal": "33", "grade": "A"}, "nominal"),
        ({"nominal": "25", "grade": "C", "division": "0.05"}, "grade"),
        ({"nominal": "25", "grade": "A", "division": "0.07"}, "division"),
        ({"nominal": "25", "grade": "A", "shape": "round"}, "shape"),
        ({"nominal": "25", "ware": "bucket"}, "ware"),
        ({"nominal": "", "grade": "A"}, "nominal"),
    ],
)
def test_odd_class_is_refused_by_field(shared_lab, given, field):
    with pytest.raises(Unacceptable) as refused:
        shared_lab.act(state_class, StateClass(shared_lab.burette, **{**PAPERS, **given}), "keeper")
    assert refused.value.field == field


def test_balance_has_no_class(shared_lab):
    with pytest.raises(Unacceptable, match="no class tolerance"):
        shared_lab.act(state_class, StateClass(shared_lab.balance, "25", **PAPERS), "keeper")


def test_run_of_a_balance_states_a_smallest_mass_that_the_next_sheet_is_judged_by(sqlite_lab):
    lab = sqlite_lab
    weights = [
        {"conventional": "50.00002", "U": "0.0001", "k": "2", "up": "50.0002", "down": "50.0003"},
        {"conventional": "199.9999", "U": "0.0003", "k": "2", "up": "200.0000", "down": "200.0001"},
    ]
    readings = ["100.0001", "100.0003", "100.0002", "100.0000", "100.0004"]
    document = {"step": "0.0001", "weights": weights, "repeatability": {"readings": readings}}
    key = run(lab, lab.balance, run=document, balance_id="", thermometer_id="")
    least = float(calibration(lab, key).document["minimum_g"])
    assert least > 0.3  # s = 0.158 mg
    sheet = lab.begin()
    lines = [(0, "step:mixed", "done"), (0, "indicator", "phenolphthalein"),
             (0, "temperature", "20.4"), (1, "container_and_standard", "60.2042"),
             (1, "container_less_standard", "60.0000"), (1, "burette_start", "0.00"),
             (1, "burette_end", "10.00")]  # fmt: skip
    lab.write_lines(lines, sheet=sheet)
    findings = {one["name"]: one for one in lab.evaluate(sheet).result["findings"]}
    assert findings["sample mass"]["verdict"] == "fails"
    versions = lab.transactions.read(
        lambda session: session.scalars(
            select(Calibration.version).where(Calibration.instrument_id == lab.balance)
        ).all()
    )
    assert sorted(versions) == [1, 2]
