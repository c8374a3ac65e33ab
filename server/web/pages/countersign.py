"""The queue of sheets that wait for a second person, and one of them."""

from fastapi import APIRouter, Response

from server.procedures.countersign import SendBack, send_back_sheet
from server.sheets.countersigning import open_countersign
from server.sheets.queue import open_queue
from server.web.forms.bench import read_countersign
from server.web.forms.posts import Again, Posted
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
    return show(visit, _TEMPLATE, open_countersign, sheet_id)


@router.post("/countersign/{sheet_id}")
def countersign(post: Posted, sheet_id: str) -> Response:
    """Countersign a sheet; its certificate is issued."""

    def work() -> str:
        command = read_countersign(post.form, sheet_id)
        password = post.form.text("password")
        answer = set_second_signature(post.visit, command, password, key=post.key)
        return f"/certificates/{answer['certificate']}"

    return post.answer(work, again=Again(_TEMPLATE, open_countersign, (sheet_id,)))


@router.post("/countersign/{sheet_id}/send-back")
def send_back(post: Posted, sheet_id: str) -> Response:
    """Send a sheet back to the bench with a remark."""

    def work() -> str:
        revision = post.form.whole("revision", example="7")
        post.act(send_back_sheet, SendBack(sheet_id, revision, post.form.text("remark")))
        return "/countersign"

    return post.answer(work)
