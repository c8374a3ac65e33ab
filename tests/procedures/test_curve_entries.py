"""Curves through the one door of entries: read, kept with their original, never twice unsaid."""

import base64
import json
from dataclasses import replace
from decimal import Decimal

import pytest

from server.curves.circumstances import SYSTEMS
from server.curves.outcome import METHODS
from server.evaluation.sheet_curves import curves_of_sheet
from server.intake.curve_upload import SentCurve
from server.lab.curve_entry import CURVE_METHODS, CURVE_SYSTEMS, read_curve_entry
from server.lab.ink import ink_digest, standing
from server.lab.refusal import NotAllowed, Unacceptable
from server.procedures.curves import find_curve_source
from server.procedures.entries import WriteEntries, read_curves, write_entries
from server.procedures.stores import WriteRecipe, write_recipe
from server.records.queries.load_files import file_fact
from server.records.tables.stores import CurveColumns, File
from server.records.tables.trail import TrailRow
from tests.procedures.conftest import RECIPE, new_entry

CURVE = (1, "curve", 1)
END_POINT = {"mode": "potentiometric", "method": "first derivative", "flask_volume_mL": "50"}


def khp_curve(end_mL=20.0, *, step=0.5, last=24.0):
    """Return volume and pH of 50 mL KHP (pK 5.4) with strong base, by the charge balance alone."""
    amount, concentration, pairs = 0.1 * end_mL, 0.1, []
    for at in range(round(last / step) + 1):
        volume = at * step
        low, high = 2.0, 13.0
        for _ in range(60):
            pH = (low + high) / 2
            h, K, K1 = 10**-pH, 10**-5.408, 10**-2.95
            share = (K1 * h + 2 * K1 * K) / (h * h + K1 * h + K1 * K)
            charge = (amount - concentration * volume * -1) / (50 + volume) + h
            charge -= amount * share / (50 + volume) + 1e-14 / h
            low, high = (pH, high) if charge > 0 else (low, pH)
        pairs.append((f"{volume:.2f}", f"{pH:.2f}"))
    return pairs


def pasted(pairs=None, *, header="volume (mL);pH"):
    lines = [";".join(pair) for pair in pairs or khp_curve()]
    return "\n".join([header, *lines]) + "\n"


def sent(text=None, **more):
    return SentCurve(pasted=text or pasted(), **more)


def curve(lab, what=None, replicate=1, **more):
    return lab.write(new_entry(replicate, "curve", "", curve=what or sent(), **more))


def with_curves(lab, end_point=END_POINT):
    recipe = lab.act(
        write_recipe, WriteRecipe("NaOH by probe", {**RECIPE, "end_point": end_point}), "keeper"
    )
    lab.recipe = recipe
    lab.sheet = lab.begin(recipe_id=recipe)
    return lab


@pytest.fixture
def probed(lab):
    """The laboratory with a sheet that takes curves, on each engine."""
    return with_curves(lab)


@pytest.fixture
def at_probe(sqlite_lab):
    """The same on SQLite alone."""
    return with_curves(sqlite_lab)


def refusal(lab, *given, **more):
    before = lab.facts()
    with pytest.raises(Unacceptable) as refused:
        curve(lab, *given, **more)
    assert lab.facts() == before
    return refused.value


def test_curve_is_written_with_its_points_and_its_original_comes_back_byte_for_byte(probed):
    content = pasted().encode("utf-16")
    what = SentCurve(file_name="run 3.csv", content_base64=base64.b64encode(content).decode())
    curve(probed, what)
    stands = standing(probed.facts().entries)[CURVE]
    assert stands.text == "run 3.csv, 49 points, pH"
    read = read_curve_entry(stands.raw)
    assert tuple(zip(read.volume_mL, read.reading, strict=True)) == tuple(khp_curve())

    def kept(session):
        row = session.get(File, stands.file_id)
        return bytes(row.content), row.sha256, file_fact(session, row.id).kept_by

    found, sha256, kept_by = probed.transactions.read(kept)
    assert (found, sha256, kept_by) == (content, read.file.sha256, "Ida Mohnke")


def test_curve_is_analysed_as_the_sheet_stands(at_probe):
    curve(at_probe)
    (told,) = curves_of_sheet(at_probe.facts())
    taken = told.analysis.outcome("first derivative")
    assert told.taken == "first derivative"
    assert abs(taken.volume_mL - 20.0) < 0.1


def test_curve_struck_through_keeps_both_and_needs_a_reason(probed):
    curve(probed)
    first = standing(probed.facts().entries)[CURVE]
    again = sent(pasted(khp_curve(20.2)), file_name="again.txt")
    assert refusal(probed, again, strikes=first.id).field == "reason"
    curve(probed, again, strikes=first.id, reason="bubble in the tip")
    entries = probed.facts().entries
    assert standing(entries)[CURVE].text == "again.txt, 49 points, pH"
    assert {one.file_id for one in entries} == {one.file_id for one in entries} - {None}
    assert len({one.file_id for one in entries}) == 2


def test_curve_struck_without_a_new_one_leaves_the_row_empty(at_probe):
    curve(at_probe)
    first = standing(at_probe.facts().entries)[CURVE]
    at_probe.write(new_entry(1, "curve", "", strikes=first.id, reason="wrong flask"))
    assert CURVE not in standing(at_probe.facts().entries)


def test_curve_that_comes_twice_under_one_uuid_is_kept_once(probed):
    one = new_entry(1, "curve", "", curve=sent())
    assert [probed.write(one)[0].repeated, probed.write(one)[0].repeated] == [False, True]
    files = probed.transactions.read(lambda session: session.query(File).count())
    assert files == 1
    other = replace(one, curve=sent(pasted(khp_curve(19.0))))
    with pytest.raises(Unacceptable, match="with something else in it"):
        probed.write(other)


def test_same_file_in_two_replicates_is_asked_about(at_probe):
    curve(at_probe)
    says = refusal(at_probe, replicate=2).says
    assert "the curve of replicate 1 already" in says
    curve(at_probe, replicate=2, reason="one flask, read by two probes")
    assert (2, "curve", 1) in standing(at_probe.facts().entries)


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"what": SentCurve()}, "content_base64"),
        ({"what": SentCurve(pasted="1;2", content_base64="MQ==")}, "content_base64"),
        ({"what": SentCurve(file_name="a.csv", content_base64="no base64")}, "content_base64"),
        ({"what": SentCurve(file_name="", content_base64="MTsy")}, "file_name"),
        ({"what": SentCurve(pasted="   ")}, "file"),
        ({"what": SentCurve(pasted="1;2\n2;3\n")}, "file"),
        ({"what": SentCurve(pasted=pasted(), mapping={"volume": 0})}, "mapping.reading"),
        ({"what": SentCurve(pasted=pasted(), drop_u_mL="0.001")}, "drop_mL"),
        ({"what": SentCurve(pasted=pasted(), drop_mL="0,05")}, "drop_mL"),
        ({"what": SentCurve(pasted=pasted(), drop_mL="0.05", drop_u_mL="0.05")}, "drop_u_mL"),
        ({"what": SentCurve(pasted=pasted(), leave_out=(3,))}, "leave_out"),
        ({"what": SentCurve(pasted=pasted(), leave_out=tuple(range(21)))}, "leave_out"),
        ({"raw": "{}"}, "raw"),
        ({"replicate": 0}, "slot"),
        ({"segment": 2}, "slot"),
    ],
)
def test_curve_that_cannot_be_taken_names_the_field(at_probe, given, field):
    what = given.pop("what", None)
    assert refusal(at_probe, what, **given).field == field


def test_curve_row_takes_no_words_and_no_other_row_a_curve(at_probe):
    with pytest.raises(Unacceptable, match="takes a file or pasted text"):
        at_probe.write(new_entry(1, "curve", "run3.csv, 61 points, pH"))
    with pytest.raises(Unacceptable, match="takes no curve"):
        at_probe.write(new_entry(0, "temperature", "20.4", curve=sent()))


def test_curve_recipe_asks_for_no_burette_reading(at_probe):
    with pytest.raises(Unacceptable, match="no row “burette_end”"):
        at_probe.write(new_entry(1, "burette_end", "20.00"))


def test_curve_method_changed_by_an_entry_needs_its_reason(at_probe):
    curve(at_probe)
    other = new_entry(1, "end_point_method", "model fit")
    with pytest.raises(Unacceptable, match="another method than the recipe's"):
        at_probe.write(other)
    at_probe.write(replace(other, reason="the derivative is noisy"))
    (told,) = curves_of_sheet(at_probe.facts())
    assert (told.taken, told.recipe_method) == ("model fit", "first derivative")
    assert told.changed.reason == "the derivative is noisy"
    with pytest.raises(Unacceptable, match="cannot be “by eye”"):
        at_probe.write(new_entry(2, "end_point_method", "by eye", reason="seen"))


def test_curve_columns_are_remembered_for_the_instrument_and_used_where_they_fit(probed):
    odd = [(f"{at}", reading, volume) for at, (volume, reading) in enumerate(khp_curve())]
    header = "run;glass;delivered"
    text = pasted(odd, header=header)
    assert "No column is named as the volume" in refusal(probed, sent(text)).says
    mapping = {"volume": 2, "reading": 1, "kind": "pH"}
    curve(probed, sent(text, mapping=mapping))
    source = probed.transactions.read(lambda session: find_curve_source(session, probed.sheet))
    assert source.columns["header"] == header.split(";")
    assert source.instrument_id == probed.burette
    other = [(at, reading, volume) for at, (volume, reading) in enumerate(khp_curve(20.1))]
    text = pasted([tuple(map(str, one)) for one in other], header=header)
    curve(probed, sent(text), replicate=2)  # nothing set: taken as the last time
    kept = read_curve_entry(standing(probed.facts().entries)[2, "curve", 1].raw)
    assert kept.volume_mL[:2] == ("0.00", "0.50")
    rows = probed.transactions.read(lambda session: session.query(CurveColumns).count())
    assert rows == 1


def test_counted_drops_become_volumes_and_keep_their_uncertainty_and_whose_they_are(at_probe):
    pairs = [(str(at), reading) for at, (_, reading) in enumerate(khp_curve())]
    what = sent(pasted(pairs, header="drops;pH"), drop_mL="0.500", drop_u_mL="0.002")
    curve(at_probe, what)
    kept = read_curve_entry(standing(at_probe.facts().entries)[CURVE].raw)
    assert [Decimal(one) for one in kept.volume_mL[:3]] == [0, Decimal("0.5"), Decimal("1.0")]
    assert (kept.drop.volume_mL, kept.drop.u_mL, kept.drop.instrument) == (
        "0.500", "0.002", "Burette U-1",
    )  # fmt: skip


def test_bad_row_left_out_by_hand_is_told_on_the_sheet(at_probe):
    text = pasted().replace("10.00;", "10.00;-.-")
    refused = refusal(at_probe, sent(text))
    assert refused.shown["row"] == 22
    curve(at_probe, sent(text, leave_out=(22,)))
    stands = standing(at_probe.facts().entries)[CURVE]
    assert stands.text == "pasted.txt, 48 points, pH, 1 left out"
    assert "Row 22, column 2" in read_curve_entry(stands.raw).set_aside[0].says


def test_curve_read_before_the_write_is_the_one_that_is_written(at_probe):
    one = new_entry(1, "curve", "", curve=sent())
    source = at_probe.transactions.read(lambda session: find_curve_source(session, at_probe.sheet))
    command = read_curves(WriteEntries(at_probe.sheet, (one,)), source)
    assert set(command.curves.by_entry) == {one.id}
    at_probe.act(write_entries, command, "analyst")
    assert standing(at_probe.facts().entries)[CURVE].text == "pasted.txt, 49 points, pH"


def test_signature_covers_the_points_and_the_trail_the_original(at_probe):
    curve(at_probe)
    entries = at_probe.facts().entries
    (stands,) = entries
    moved = replace(stands, raw=stands.raw.replace('"0.50"', '"0.51"'))
    assert moved.raw != stands.raw
    assert ink_digest((moved,)) != ink_digest(entries)

    def last(session):
        row = session.query(TrailRow).order_by(TrailRow.seq.desc()).first()
        return json.loads(row.body)["entries"][0]

    line = at_probe.transactions.read(last)
    assert line["original_sha256"] == read_curve_entry(stands.raw).file.sha256


def test_curve_is_not_written_by_a_reader(at_probe):
    with pytest.raises(NotAllowed):
        at_probe.write(new_entry(1, "curve", "", curve=sent()), who="reader")


def test_curve_methods_of_the_laboratory_are_those_that_are_computed():
    assert CURVE_METHODS == METHODS
    assert set(CURVE_SYSTEMS) == set(SYSTEMS) | {"none"}
