import threading
from concurrent.futures import ThreadPoolExecutor

import pytest
from sqlalchemy import func, select

from server.lab.refusal import KeyMissing, Unacceptable
from server.procedures.lots import MakeUpLot, make_up_lot
from server.procedures.repeats import Answered, find_answer, once
from server.records.tables.lots import Lot
from server.records.tables.people import IdempotencyKey

BODY = {"titrant": "NaOH"}


def ask(lab, work, *, key="k-1", body=BODY, who="analyst"):
    return lab.transactions.write(
        lambda session: once(
            session, actor=lab.people[who], key=key, body=body, now=lab.clock(),
            work=lambda: work(session),
        )
    )  # fmt: skip


def make_up(lab):
    def work(session):
        command = MakeUpLot("NaOH", "0.1")
        code = make_up_lot(session, command, actor=lab.people["analyst"], now=lab.clock())
        return {"lot": code}

    return work


def count_of(lab, table):
    asked = select(func.count()).select_from(table)
    return lab.transactions.read(lambda session: session.scalar(asked))


def test_key_asked_again_gets_the_first_answer_and_does_nothing(lab):
    lots = count_of(lab, Lot)
    first = ask(lab, make_up(lab))
    assert ask(lab, make_up(lab)) == first
    assert count_of(lab, Lot) == lots + 1


@pytest.mark.parametrize("answer", [None, {}, [], 0, "", {"n": 1.5, "text": "18.60"}])
def test_key_answer_of_any_json_kind_comes_back_equal(sqlite_lab, answer):
    assert ask(sqlite_lab, lambda _: {"answer": answer}) == {"answer": answer}
    assert ask(sqlite_lab, lambda _: 1 / 0) == {"answer": answer}


def test_key_with_another_body_is_refused(lab):
    ask(lab, make_up(lab))
    with pytest.raises(Unacceptable) as refused:
        ask(lab, make_up(lab), body={"titrant": "KOH"})
    assert refused.value.field == "key"


def test_key_of_another_person_is_another_key(lab):
    first = ask(lab, make_up(lab))
    assert ask(lab, make_up(lab), who="second analyst") != first


@pytest.mark.parametrize("key", [None, "", "x" * 101])
def test_key_missing_or_endless_is_refused(sqlite_lab, key):
    with pytest.raises(KeyMissing) as refused:
        ask(sqlite_lab, make_up(sqlite_lab), key=key)
    assert refused.value.field == "key"


def test_key_of_work_that_was_refused_is_free_again(lab):
    def refuse(session):
        make_up(lab)(session)
        raise Unacceptable("no", field="x")

    lots = count_of(lab, Lot)
    with pytest.raises(Unacceptable):
        ask(lab, refuse)
    assert (count_of(lab, Lot), count_of(lab, IdempotencyKey)) == (lots, 0)
    assert ask(lab, make_up(lab))


def test_find_answer_writes_nothing_and_tells_what_came_before(lab):
    def find(body=BODY):
        return lab.transactions.read(
            lambda session: find_answer(
                session, actor=lab.people["analyst"], key="k-1", body=body
            )
        )  # fmt: skip

    assert find() is None
    first = ask(lab, make_up(lab))
    assert find() == Answered(first)
    with pytest.raises(Unacceptable):
        find({"titrant": "KOH"})


def test_two_hundred_duplicates_at_once_do_it_once_and_answer_alike(lab):
    # R087
    lots, began = count_of(lab, Lot), threading.Barrier(20)

    def tap(n):
        if n < 20:
            began.wait()
        return ask(lab, make_up(lab))

    with ThreadPoolExecutor(20) as pool:
        answers = list(pool.map(tap, range(200)))
    assert all(one == answers[0] for one in answers)
    assert count_of(lab, Lot) == lots + 1
    assert lab.chain().holds
