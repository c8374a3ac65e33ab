"""Labels are written down in the trail, one row each, and found again by bottle and by print."""

from concurrent.futures import ThreadPoolExecutor

import pytest

from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.procedures.labels import PrintLabels, print_labels
from server.procedures.lots import FillBottles, UseUpBottle, fill_bottles, use_up_bottle
from server.records.queries.list_labels import (
    labels_of_bottles,
    labels_of_print,
    last_labels,
)
from server.records.queries.load_lots import bottle_by_code

HERE = "https://ledger.example"


def bottles(lab, count=3):
    return lab.act(fill_bottles, FillBottles(lab.lot, "Shelf 1", "1000", count), "analyst")


def out(lab, codes, who="analyst", **more):
    command = PrintLabels(tuple(codes), "62x40", base_url=HERE, **more)
    return lab.act(print_labels, command, who)


def test_print_is_a_row_of_the_trail_for_each_label(lab):
    codes = bottles(lab)
    number = out(lab, codes)
    found = lab.transactions.read(lambda session: labels_of_print(session, number))
    assert [one.text.code for one in found] == list(codes)
    assert {one.first_seq for one in found} == {number}
    assert found[0].text.nominal == "0.1"
    assert found[0].stock.base_url == HERE
    assert [act for _, act, _ in lab.acts()][-3:] == ["printed a label"] * 3
    for other in (number - 1, number + 1, 0, -1, 2**80):
        assert lab.transactions.read(lambda session, n=other: labels_of_print(session, n)) == []


def test_label_again_needs_a_reason_which_only_that_label_bears(lab):
    codes = bottles(lab)
    out(lab, codes[:1])
    with pytest.raises(Unacceptable) as refused:
        out(lab, codes)
    assert refused.value.field == "reason"
    assert codes[0] in refused.value.says
    assert codes[1] not in refused.value.says
    number = out(lab, codes, "keeper", reason="  smeared ")
    found = lab.transactions.read(lambda session: labels_of_print(session, number))
    assert [one.text.reason for one in found] == ["smeared", "", ""]


def test_last_labels_are_each_bottles_newest(lab):
    first, second = bottles(lab, 2)
    out(lab, [first, second])
    number = out(lab, [first], reason="smeared")
    found = lab.transactions.read(last_labels)
    assert [(one.text.code, one.text.reason) for one in found] == [(first, "smeared"), (second, "")]
    ids = lab.transactions.read(lambda session: [bottle_by_code(session, first).id])
    own = lab.transactions.read(lambda session: labels_of_bottles(session, ids))
    assert own[0].seq == number
    assert len(own) == 2


def test_prints_of_eight_at_once_keep_their_rows_together(lab):
    codes = bottles(lab, 16)
    pairs = [codes[i : i + 2] for i in range(0, 16, 2)]
    with ThreadPoolExecutor(8) as pool:
        numbers = list(pool.map(lambda pair: out(lab, pair), pairs))
    for number, pair in zip(numbers, pairs, strict=True):
        found = lab.transactions.read(lambda session, n=number: labels_of_print(session, n))
        assert [one.text.code for one in found] == list(pair)


def test_label_for_no_bottle_twice_used_up_or_unknown_is_refused_and_not_noted(lab):
    first, second = bottles(lab, 2)
    lab.act(use_up_bottle, UseUpBottle(second), "analyst")
    before = lab.acts()
    for codes, refusal in (
        ((), Unacceptable),
        ((first, first.lower()), Unacceptable),
        ((first, second), NotAllowed),
        (("00000000",), NotFound),
        ([first] * 101, Unacceptable),
    ):
        with pytest.raises(refusal):
            out(lab, codes)
    with pytest.raises(Unacceptable) as refused:
        lab.act(print_labels, PrintLabels((first,), "62x40"), "analyst")
    assert refused.value.field == "base_url"
    assert lab.acts() == before
