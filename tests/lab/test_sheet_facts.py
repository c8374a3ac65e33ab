def test_sheet_state_and_instrument_by_kind(facts, sheet_parts):
    sheet = facts(handed_in_at=sheet_parts["now"])
    assert sheet.state == "handed in"
    assert sheet.instrument("burette").name == "Burette 1"
    assert sheet.instrument("room monitor") is None


def test_measured_signature_is_that_of_the_standing_evaluation(facts, sheet_parts):
    # a clock that runs behind on another host must not bring an older signature to the front
    writer, make = sheet_parts["writer"], sheet_parts["signature"]
    new = make(writer, "measured", id="g-new", evaluation_id="v-2")
    old = make(writer, "measured", id="g-old", evaluation_id="v-1")
    second = make(sheet_parts["second"], "countersigned", evaluation_id="v-2")
    sheet = facts(signatures=(new, old, second), evaluation=sheet_parts["evaluation"](id="v-2"))
    assert sheet.measured_signature is new


def test_measured_signature_without_evaluation_is_none(facts):
    assert facts().measured_signature is None
