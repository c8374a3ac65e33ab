"""Bench sheets over the API; the door of entries is here, and only here."""

from dataclasses import asdict, dataclass
from typing import Annotated, Any
from urllib.parse import unquote

from fastapi import APIRouter, Depends, Request, Response

from server.intake.curve_upload import SentCurve
from server.lab.refusal import NotSignedIn
from server.lab.roles import Act
from server.procedures.bench import (
    AbandonSheet,
    BeginSheet,
    LetBeUsed,
    abandon_sheet,
    begin_sheet,
    let_be_used,
)
from server.procedures.curves import find_curve_source
from server.procedures.entries import WriteEntries, read_curves, write_entries
from server.procedures.hand_in import HandIn
from server.procedures.new_entries import NewEntry
from server.sheets.bench_home import open_bench_home
from server.sheets.bench_sheet import open_bench_sheet
from server.sheets.curve_preview import curve_preview, read_for_preview
from server.sheets.hand_in import evaluate_hand_in, read_hand_in
from server.web.acting import act
from server.web.api.desk import TOKEN_HEADER, AtApi, answer, made
from server.web.bodies import Given, JsonBody, body_of, json_bytes, model_of, read_body
from server.web.refusals import NotFromHere
from server.web.signing import Given as Signer
from server.web.signing import hand_in
from server.web.visits import AtDesk, Visit

router = APIRouter(tags=["sheets"])
BENCH_HEADER = "X-Titrant-Ledger"
PERSON_HEADER = "X-Titrant-Person"

#: An entry without its UUID is let in here, so that its refusal is the laboratory's own.
_ENTRY = model_of(NewEntry, without=("id",), also={"id": (str, "")})


@dataclass(frozen=True, slots=True)
class _Entries:
    """The body of the door: a list of entries, or an object that holds it.

    ``sent_at``: the time on the sender's clock, so that it is known how wrong that clock is.
    """

    entries: list[_ENTRY]  # type: ignore[valid-type]
    sent_at: str | None = None


_BEGIN = body_of(BeginSheet)
_ABANDON = body_of(AbandonSheet, "sheet_id")
_LET = body_of(LetBeUsed, "sheet_id")
_HAND_IN = body_of(HandIn, "sheet_id", password=str, name=(str, ""))
_PREVIEW = body_of(SentCurve, replicate=int)
_DOOR = JsonBody(model_of(_Entries))


@router.get("/sheets")
def sheets(visit: AtDesk) -> Response:
    """List open sheets, and lots that can be standardized."""
    return answer(visit.read(open_bench_home))


@router.post("/sheets", openapi_extra=_BEGIN.openapi, status_code=201)
def begin(desk: AtApi, given: Annotated[Given, Depends(_BEGIN)]) -> Response:
    """Begin a bench sheet."""
    sheet_id = desk.act(begin_sheet, BeginSheet(**given))
    return made(f"/api/sheets/{sheet_id}", id=sheet_id)


@router.get("/sheets/{sheet_id}")
def sheet(visit: AtDesk, sheet_id: str) -> Response:
    """Tell a whole bench sheet, as the bench page draws it."""
    return answer(visit.read(open_bench_sheet, sheet_id))


async def _entries(request: Request) -> Given:
    body = await json_bytes(request)
    if body.lstrip()[:1] == b"[":
        body = b'{"entries":' + body + b"}"
    return read_body(_DOOR.model, body)


def _at_door(request: Request, visit: AtDesk) -> Visit:
    """Return who writes: a page of this server by its header, a script by its session's token.

    Another site's page cannot send the header: a browser asks this server first and is refused.
    """
    person = visit.person
    if not request.headers.get(BENCH_HEADER) and not visit.holds_token(
        request.headers.get(TOKEN_HEADER, "")
    ):
        says = f"Entries come with {BENCH_HEADER} from the bench page, or with {TOKEN_HEADER}."
        raise NotFromHere(says, field=TOKEN_HEADER)
    writer = unquote(request.headers.get(PERSON_HEADER, ""))
    if writer and writer != person.person_id:
        says = "These entries were written by somebody else on this tablet: let her sign in again."
        raise NotSignedIn(says)
    return visit


@router.post("/sheets/{sheet_id}/entries", openapi_extra=_DOOR.openapi)
def write(
    visit: Annotated[Visit, Depends(_at_door)],
    sheet_id: str,
    given: Annotated[Given, Depends(_entries)],
) -> Response:
    """Write entries: each with its own UUID, all or none; a repeated one gets its first answer."""
    entries = tuple(NewEntry(**dict(entry)) for entry in given["entries"])
    command = WriteEntries(sheet_id, entries, sent_at=given["sent_at"])
    if any(entry.curve is not None for entry in entries):
        visit.person.need(Act.WRITE)
        command = read_curves(command, visit.read(find_curve_source, sheet_id))
    written = act(visit, write_entries, command, key=None)
    return answer(
        {
            "written": [asdict(one) for one in written],
            "sheet": asdict(visit.read(open_bench_sheet, sheet_id)),
        }
    )


@router.post("/sheets/{sheet_id}/curves/preview", openapi_extra=_PREVIEW.openapi)
def preview(
    visit: Annotated[Visit, Depends(_at_door)],
    sheet_id: str,
    given: Annotated[Given, Depends(_PREVIEW)],
) -> Response:
    """Tell how a curve would be read and which volumes it has; nothing is stored."""
    read = visit.read(read_for_preview, sheet_id, given.pop("replicate"))
    return answer(curve_preview(read, SentCurve(**given), now=visit.now))


@router.get("/sheets/{sheet_id}/hand-in")
def before_hand_in(visit: AtDesk, sheet_id: str) -> Response:
    """Tell what a sheet comes to, with its findings, before it is signed."""
    return answer(evaluate_hand_in(visit.read(read_hand_in, sheet_id)))


@router.post("/sheets/{sheet_id}/hand-in", openapi_extra=_HAND_IN.openapi)
def sign(desk: AtApi, sheet_id: str, given: Annotated[Given, Depends(_HAND_IN)]) -> Response:
    """Sign a sheet as *measured* and hand it in.

    The password is asked again, and at the first signature of a session the sign-in name too.
    """
    signer = Signer(given.pop("name"), given.pop("password"))
    command = HandIn(sheet_id=sheet_id, **given)
    told: Any = hand_in(desk.visit, command, signer, key=desk.key)
    return answer(told)


@router.post("/sheets/{sheet_id}/abandon", openapi_extra=_ABANDON.openapi)
def abandon(desk: AtApi, sheet_id: str, given: Annotated[Given, Depends(_ABANDON)]) -> Response:
    """Abandon a sheet; it stays readable."""
    desk.act(abandon_sheet, AbandonSheet(sheet_id=sheet_id, **given))
    return answer({"id": sheet_id, "state": "abandoned"})


@router.post("/sheets/{sheet_id}/let-be-used", openapi_extra=_LET.openapi)
def let(desk: AtApi, sheet_id: str, given: Annotated[Given, Depends(_LET)]) -> Response:
    """Let something of a sheet be used out of date, with a reason."""
    revision = desk.act(let_be_used, LetBeUsed(sheet_id=sheet_id, **given))
    return answer({"id": sheet_id, "revision": revision})
