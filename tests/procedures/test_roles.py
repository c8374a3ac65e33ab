"""Every procedure by every role: allowed or refused exactly as the laboratory's table says."""

import importlib
import inspect
import pkgutil

import pytest

from server import procedures
from server.lab.refusal import NotAllowed, Refusal
from server.procedures.bench import (
    AbandonSheet,
    BeginSheet,
    LetBeUsed,
    abandon_sheet,
    begin_sheet,
    let_be_used,
)
from server.procedures.bottles import MoveBottle, OpenBottle, move_bottle, open_bottle
from server.procedures.calibration_files import HandOver, hand_over
from server.procedures.calibration_runs import RecordRun, StateClass, record_run, state_class
from server.procedures.countersign import Countersign, countersign_sheet
from server.procedures.entries import WriteEntries, write_entries
from server.procedures.hand_in import HandIn, hand_in_sheet, prepare_hand_in
from server.procedures.holds import HoldThing, ReleaseThing, hold_thing, release_thing
from server.procedures.instrument_log import (
    MeasureDrop,
    SetLimits,
    StrikeLine,
    WriteCheck,
    measure_drop,
    set_limits,
    strike_check,
    write_check,
)
from server.procedures.instruments import (
    DescribeInstrument,
    RecordCalibration,
    RegisterInstrument,
    describe_instrument,
    record_calibration,
    register_instrument,
)
from server.procedures.label_hazards import (
    ConfirmHazards,
    WithdrawHazards,
    confirm_hazards,
    withdraw_hazards,
)
from server.procedures.labels import PrintLabels, prepare_labels, print_labels
from server.procedures.laboratory import ChangeSettings, change_settings
from server.procedures.lots import (
    ConfirmPull,
    FillBottles,
    MakeUpLot,
    ProposePull,
    UseUpBottle,
    confirm_pull,
    fill_bottles,
    make_up_lot,
    propose_pull,
    use_up_bottle,
)
from server.procedures.people import (
    AddPerson,
    ChangeRoles,
    CloseAccount,
    add_person,
    change_roles,
    close_account,
)
from server.procedures.send_back import SendBack, send_back_sheet
from server.procedures.standard_lots import (
    AttachCertificate,
    CountStandardLot,
    OpenStandardLot,
    RecordDrying,
    RecordRetest,
    RecordUse,
    StrikeLotLine,
    attach_certificate,
    count_lot,
    open_lot,
    record_drying,
    record_retest,
    record_use,
    strike_lot_line,
)
from server.procedures.stores import (
    ReceiveStandardLot,
    WriteRecipe,
    receive_standard_lot,
    write_recipe,
)
from server.procedures.uses import StrikeUse, UseBottle, strike_use, use_bottle

ROLES = ("analyst", "countersigner", "keeper", "steward", "reader")
NOBODY = "00000000-0000-0000-0000-000000000001"

# who may do what; the commands name things that are not there, so whoever may is refused later
TABLE = {
    make_up_lot: ({"analyst"}, MakeUpLot("", "0.1")),
    fill_bottles: ({"analyst"}, FillBottles("x", "Shelf", "1000")),
    use_up_bottle: ({"analyst"}, UseUpBottle("x")),
    open_bottle: ({"analyst"}, OpenBottle("x")),
    move_bottle: ({"analyst"}, MoveBottle("x", "Shelf 2")),
    use_bottle: ({"analyst", "keeper"}, UseBottle("x", "W-1")),
    strike_use: ({"analyst", "keeper"}, StrikeUse("x", NOBODY, "misread")),
    begin_sheet: ({"analyst"}, BeginSheet("x", NOBODY, NOBODY, NOBODY, NOBODY)),
    write_entries: ({"analyst"}, WriteEntries(NOBODY, ())),
    abandon_sheet: ({"analyst"}, AbandonSheet(NOBODY, "leak")),
    prepare_hand_in: ({"analyst"}, NOBODY),
    hand_in_sheet: ({"analyst"}, HandIn(NOBODY, 1)),
    countersign_sheet: ({"countersigner"}, Countersign(NOBODY, 1)),
    send_back_sheet: ({"countersigner"}, SendBack(NOBODY, 1, "look again")),
    hold_thing: ({"analyst", "countersigner", "keeper"}, HoldThing("lot", "x", "cloudy")),
    release_thing: ({"keeper", "countersigner"}, ReleaseThing("lot", "x", "clear")),
    receive_standard_lot: ({"keeper"}, ReceiveStandardLot("", "KHP", "", "", "", "", {})),
    write_recipe: ({"keeper"}, WriteRecipe("", {})),
    register_instrument: ({"keeper"}, RegisterInstrument("", "", "", "", "", "")),
    record_calibration: ({"keeper"}, RecordCalibration(NOBODY, "", "", "", "", "", {})),
    describe_instrument: ({"keeper"}, DescribeInstrument(NOBODY, {}, "moved", {})),
    record_run: ({"keeper"}, RecordRun(NOBODY, {}, "", "", "")),
    state_class: ({"keeper"}, StateClass(NOBODY, "10", "", "", "")),
    hand_over: ({"keeper"}, HandOver(NOBODY, "paper.csv", "")),
    set_limits: ({"keeper"}, SetLimits(NOBODY, {})),
    write_check: ({"analyst", "keeper"}, WriteCheck(NOBODY)),
    strike_check: ({"analyst", "keeper"}, StrikeLine(NOBODY, NOBODY, "misread")),
    measure_drop: ({"analyst", "keeper"}, MeasureDrop(NOBODY, 20)),
    open_lot: ({"analyst", "keeper"}, OpenStandardLot(NOBODY, "")),
    record_drying: ({"analyst", "keeper"}, RecordDrying(NOBODY, "")),
    record_use: ({"analyst", "keeper"}, RecordUse(NOBODY, "0.4", "spilled")),
    count_lot: ({"analyst", "keeper"}, CountStandardLot(NOBODY, "10")),
    record_retest: ({"keeper"}, RecordRetest(NOBODY, "", "", "")),
    strike_lot_line: ({"analyst", "keeper"}, StrikeLotLine(NOBODY, NOBODY, "misread")),
    attach_certificate: ({"keeper"}, AttachCertificate(NOBODY, "paper.pdf", "")),
    let_be_used: ({"keeper"}, LetBeUsed(NOBODY, "burette", "checked")),
    propose_pull: ({"keeper"}, ProposePull("x", "wrong salt")),
    confirm_pull: ({"countersigner"}, ConfirmPull("x")),
    prepare_labels: ({"analyst", "keeper"}, PrintLabels((), "62x40")),
    print_labels: ({"analyst", "keeper"}, PrintLabels((), "62x40")),
    confirm_hazards: ({"steward"}, ConfirmHazards("NaOH", "0.1", "", "", 99)),
    withdraw_hazards: ({"steward"}, WithdrawHazards("NaOH", "0.1", "", 99)),
    add_person: ({"steward"}, AddPerson("", "", (), "")),
    change_roles: ({"steward"}, ChangeRoles(NOBODY, ("reader",), 1)),
    close_account: ({"steward"}, CloseAccount(NOBODY)),
    change_settings: ({"steward"}, ChangeSettings("", "", "UTC", 99)),
}


def more_for(procedure, lab, who):
    """Return what some procedures take besides their command."""
    if procedure is hand_in_sheet:
        return {"evaluated": None, "proof": lab.proof(who)}
    if procedure is countersign_sheet:
        return {"proof": lab.proof(who)}
    return {"password_hash": "none"} if procedure is add_person else {}


@pytest.mark.parametrize("role", ROLES)
@pytest.mark.parametrize("procedure", TABLE, ids=lambda one: one.__name__)
def test_procedure_by_role_is_allowed_or_refused_by_the_table(shared_lab, procedure, role):
    allowed, command = TABLE[procedure]
    more = more_for(procedure, shared_lab, role)
    before = shared_lab.acts()
    with pytest.raises(Refusal) as refused:
        shared_lab.act(procedure, command, role, **more)
    says = refused.value.says
    for_want_of_role = isinstance(refused.value, NotAllowed) and "you need the role" in says
    assert for_want_of_role is (role not in allowed)
    assert shared_lab.acts() == before


def test_table_names_every_procedure_that_takes_an_actor():
    # sessions, set up, one's own password, tokens and watches are everybody's own affair
    own = {"change_password", "find_own_account", "record_proof", "sign_out", "once", "find_answer"}
    own |= {"make_token", "revoke_token"}
    own |= {"watch_thing", "stop_watching", "read_notices", "send_notices"}
    # parts of other procedures, which ask for the role
    own |= {"keep_calibration", "keep_curve", "keep_file", "write_line", "strike_line"}
    own |= {"find_curve_source"}
    found = set()
    for module in pkgutil.iter_modules(procedures.__path__):
        inside = importlib.import_module(f"server.procedures.{module.name}")
        for name, work in vars(inside).items():
            public = inspect.isfunction(work) and work.__module__ == inside.__name__
            if public and not name.startswith("_") and name not in own:
                parameters = list(inspect.signature(work).parameters)
                if parameters[:1] == ["session"] and "actor" in parameters:
                    found.add(name)
    assert found - {"note_act", "sign"} == {one.__name__ for one in TABLE}
