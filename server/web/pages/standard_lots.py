"""The life of a standard lot: opened, dried, used, counted, re-tested; its certificate's file."""

from collections.abc import Callable
from typing import Any

from fastapi import APIRouter, Response

from server.procedures.standard_lots import (
    attach_certificate,
    count_lot,
    open_lot,
    record_drying,
    record_retest,
    record_use,
    strike_lot_line,
)
from server.sheets.standard_lot_page import open_standard_lot
from server.web.forms.posts import Again, Post, Posted
from server.web.forms.standard_lots import (
    Reader,
    named,
    read_certificate_file,
    read_count,
    read_drying_form,
    read_opened,
    read_retest,
    read_strike,
    read_use,
)

router = APIRouter()
_PAGE = "stores/standard_lot.html"


def _written(
    post: Post, standard_lot_id: str, prefix: str, *, read: Reader, act: Callable[..., Any]
) -> Response:
    """Write into a lot's log and lead back to its page; a refusal shows the page's form again."""

    def work() -> str:
        with named(prefix):
            post.act(act, read(post.form, standard_lot_id))
        return f"/stores/standard-lots/{standard_lot_id}"

    return post.answer(work, again=Again(_PAGE, open_standard_lot, (standard_lot_id,)))


@router.post("/stores/standard-lots/{standard_lot_id}/opened")
def opened(post: Posted, standard_lot_id: str) -> Response:
    """Write that a lot was opened."""
    return _written(post, standard_lot_id, "opened", read=read_opened, act=open_lot)


@router.post("/stores/standard-lots/{standard_lot_id}/dryings")
def dried(post: Posted, standard_lot_id: str) -> Response:
    """Write a drying."""
    return _written(post, standard_lot_id, "drying", read=read_drying_form, act=record_drying)


@router.post("/stores/standard-lots/{standard_lot_id}/uses")
def used(post: Posted, standard_lot_id: str) -> Response:
    """Write a use that no sheet holds."""
    return _written(post, standard_lot_id, "use", read=read_use, act=record_use)


@router.post("/stores/standard-lots/{standard_lot_id}/counts")
def counted(post: Posted, standard_lot_id: str) -> Response:
    """Write how much is there by weighing it."""
    return _written(post, standard_lot_id, "count", read=read_count, act=count_lot)


@router.post("/stores/standard-lots/{standard_lot_id}/retests")
def retested(post: Posted, standard_lot_id: str) -> Response:
    """Write a re-test."""
    return _written(post, standard_lot_id, "retest", read=read_retest, act=record_retest)


@router.post("/stores/standard-lots/{standard_lot_id}/strike")
def struck(post: Posted, standard_lot_id: str) -> Response:
    """Strike a line of a lot's log through."""
    return _written(post, standard_lot_id, "strike", read=read_strike, act=strike_lot_line)


@router.post("/stores/standard-lots/{standard_lot_id}/certificate")
def certificate(post: Posted, standard_lot_id: str) -> Response:
    """Keep the file of a lot's certificate."""
    return _written(
        post, standard_lot_id, "certificate", read=read_certificate_file, act=attach_certificate
    )
