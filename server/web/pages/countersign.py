"""The queue of sheets that wait for a second person, and one of them."""

from fastapi import APIRouter, Response

from server.procedures.send_back import send_back_sheet
from server.sheets.countersigning import open_countersign
from server.sheets.queue import open_queue
from server.web.forms.bench import read_countersign, read_send_back, read_signer
from server.web.forms.posts import Again, Posted
from server.web.proving import asks_name
from server.web.showing import show
from server.web.signing import set_second_signature
from server.web.visits import AtDesk

router = APIRouter()
_TEMPLATE = "countersign/sheet.html"


@router.get("/countersign")
def queue(visit: AtDesk) -> Response:
    """Show the sheets that wait, longest first."""
    return show(visit, "countersign/queue.html", open_queue)


@router.get("/countersign/{sheet_id}")
def sheet(visit: AtDesk, sheet_id: str) -> Response:
    """Show one sheet: the number, why, what was written."""
    return show(visit, _TEMPLATE, open_countersign, sheet_id, asks_name=asks_name(visit), sent="")


@router.post("/countersign/{sheet_id}")
def countersign(post: Posted, sheet_id: str) -> Response:
    """Countersign a sheet; its certificate is issued."""

    def work() -> str:
        command = read_countersign(post.form, sheet_id)
        signer = read_signer(post.form)
        answer = set_second_signature(post.visit, command, signer, key=post.key)
        return f"/certificates/{answer['certificate']}"

    return post.answer(work, again=_again(post, sheet_id, sent="sign"))


@router.post("/countersign/{sheet_id}/send-back")
def send_back(post: Posted, sheet_id: str) -> Response:
    """Send a sheet back to the bench with a remark, remarks on rows, or both."""

    def work() -> str:
        post.act(send_back_sheet, read_send_back(post.form, sheet_id))
        return "/countersign"

    return post.answer(work, again=_again(post, sheet_id, sent="back"))


def _again(post: Posted, sheet_id: str, *, sent: str) -> Again:
    more = {"asks_name": asks_name(post.visit), "sent": sent}
    return Again(_TEMPLATE, open_countersign, (sheet_id,), more=more)
