"""Calibrations: by certificate, done here, by class, from a file; and one as it was recorded."""

from collections.abc import Callable
from typing import Annotated, Any
from urllib.parse import urlencode

from fastapi import APIRouter, Path, Query, Response

from server.intake.calibration_file import Asked, read_calibration_file
from server.lab.refusal import NotAllowed, Refusal, Unacceptable
from server.procedures.calibration_files import HandOver, hand_over
from server.procedures.calibration_runs import record_run, state_class
from server.procedures.instrument_log import measure_drop
from server.procedures.instruments import record_calibration
from server.sheets.import_page import (
    ImportPage,
    asked_query,
    import_page,
    open_import_start,
    read_original_of,
)
from server.sheets.instruments_page import open_calibration, open_instrument
from server.sheets.run_form import AskedRun, judge_preview, open_drop_form, open_run_form
from server.sheets.run_form import read_run as read_for_preview
from server.web.forms.field_words import in_words
from server.web.forms.instruments import read_calibration_form, read_class
from server.web.forms.posts import Again, Post, Posted
from server.web.forms.runs import (
    picked_of,
    read_drop,
    read_record_run,
    read_run,
    refusals_of,
    rows_shown,
)
from server.web.forms.typed import Typed
from server.web.pages.keeping import open_for_keeper
from server.web.showing import problem_of, show
from server.web.visits import AtDesk

router = APIRouter()
_CALIBRATION, _CLASS = "instruments/calibration_new.html", "instruments/class_new.html"
_RUN, _ONE = "instruments/run_new.html", "instruments/calibration.html"
_DROP = "instruments/drop_new.html"
#: What the column of versions holds.
MOST_VERSION = 2**31 - 1
_HAND_OVER, _CONFIRM = "instruments/import_new.html", "instruments/import_confirm.html"


def _open_for_calibration(session: Any, instrument_id: str, **who: Any) -> Any:
    open_for_keeper(session, **who)
    return open_instrument(session, instrument_id, **who)


@router.get("/instruments/{instrument_id}/calibrations/new")
def calibration_form(visit: AtDesk, instrument_id: str) -> Response:
    """Show the form for a calibration by its certificate."""
    return show(visit, _CALIBRATION, _open_for_calibration, instrument_id)


@router.post("/instruments/{instrument_id}/calibrations/new")
def record(post: Posted, instrument_id: str) -> Response:
    """Record a calibration; it serves from now on."""

    def work() -> str:
        kind = post.visit.read(open_instrument, instrument_id).kind
        post.act(record_calibration, read_calibration_form(post.form, instrument_id, kind))
        return f"/instruments/{instrument_id}"

    return post.answer(work, again=Again(_CALIBRATION, _open_for_calibration, (instrument_id,)))


@router.get("/instruments/{instrument_id}/calibrations/{version}")
def calibration(
    visit: AtDesk, instrument_id: str, version: Annotated[int, Path(ge=1, le=MOST_VERSION)]
) -> Response:
    """Show one calibration with the readings that it came from."""
    return show(visit, _ONE, open_calibration, instrument_id, version)


def _open_for_class(session: Any, instrument_id: str, **who: Any) -> Any:
    page = _open_for_calibration(session, instrument_id, **who)
    if not page.has_class:
        raise NotAllowed(f"A {page.kind} has no class tolerance: calibrate it.")
    return page


@router.get("/instruments/{instrument_id}/class/new")
def class_form(visit: AtDesk, instrument_id: str) -> Response:
    """Show the form by which a class tolerance serves."""
    return show(visit, _CLASS, _open_for_class, instrument_id)


@router.post("/instruments/{instrument_id}/class/new")
def serve_class(post: Posted, instrument_id: str) -> Response:
    """Let a class tolerance serve, as a calibration that says so."""

    def work() -> str:
        post.act(state_class, read_class(post.form, instrument_id))
        return f"/instruments/{instrument_id}"

    return post.answer(work, again=Again(_CLASS, _open_for_class, (instrument_id,)))


@router.get("/instruments/{instrument_id}/runs/new")
def run_form(visit: AtDesk, instrument_id: str) -> Response:
    """Show the form of a calibration that is done here."""
    return show(visit, _RUN, open_run_form, instrument_id, with_page=_rows_of(None))


@router.post("/instruments/{instrument_id}/runs/new")
def run(post: Posted, instrument_id: str) -> Response:
    """Work a run out and show it, make room for more rows, or record it."""
    if post.form.text("do") != "record":
        return _worked_out(post, instrument_id)

    def work() -> str:
        kind = post.visit.read(open_run_form, instrument_id).kind
        typed = read_run(post.form, kind)
        with refusals_of(typed):
            post.act(record_run, read_record_run(post.form, instrument_id, typed.document))
        return f"/instruments/{instrument_id}"

    try:
        return post.answer(work)
    except Unacceptable as refusal:
        return _worked_out(post, instrument_id, refusal)


def _worked_out(post: Post, instrument_id: str, refusal: Refusal | None = None) -> Response:
    """Show a run's form again as it was typed, with what it comes to so far."""
    visit, form = post.visit, post.form
    visit.person  # noqa: B018 - refuses who is not signed in
    post.need_token()
    kind = visit.read(open_run_form, instrument_id).kind
    typed = read_run(form, kind)
    preview, problem = None, None if refusal is None else problem_of(in_words(refusal))
    try:
        with refusals_of(typed):
            asked = AskedRun(instrument_id, typed.document, picked_of(form))
            preview = judge_preview(visit.read(read_for_preview, asked))
    except Unacceptable as unready:
        problem = problem or problem_of(in_words(unready))
    volumes = {} if preview is None else preview.volumes
    return show(
        visit,
        _RUN,
        open_run_form,
        instrument_id,
        status=200 if refusal is None else 422,
        with_page=_rows_of(form),
        typed=form.shown(),
        problem=problem,
        preview=preview,
        says=typed.words(preview.says) if preview else "",
        says_field=typed.field(preview.field) if preview else None,
        volumes={typed.row_of("weighings", i): one for i, one in volumes.items()},
    )


def _rows_of(form: Typed | None) -> Callable[[Any], dict[str, Any]]:
    """Return how many rows the form of a kind shows."""

    def rows(page: Any) -> dict[str, Any]:
        count = rows_shown(form or Typed({}), page.kind)
        return {"rows": range(count), "preview": None, "volumes": {}}

    return rows


@router.get("/instruments/{instrument_id}/drops/new")
def drop_form(visit: AtDesk, instrument_id: str) -> Response:
    """Show the form by which a burette's drops are weighed."""
    return show(visit, _DROP, open_drop_form, instrument_id)


@router.post("/instruments/{instrument_id}/drops/new")
def drop(post: Posted, instrument_id: str) -> Response:
    """Write the volume of a burette's drop in its log."""

    def work() -> str:
        post.visit.read(open_drop_form, instrument_id)
        command, typed = read_drop(post.form, instrument_id)
        with refusals_of(typed):
            post.act(measure_drop, command)
        return f"/instruments/{instrument_id}#drop"

    return post.answer(work, again=Again(_DROP, open_drop_form, (instrument_id,)))


@router.get("/instruments/{instrument_id}/imports/new")
def hand_over_form(visit: AtDesk, instrument_id: str) -> Response:
    """Show where a calibration's file is handed over."""
    return show(visit, _HAND_OVER, open_import_start, instrument_id)


@router.post("/instruments/{instrument_id}/imports/new")
def take_file(post: Posted, instrument_id: str) -> Response:
    """Take a calibration's file, once it can be read; nothing counts before it is confirmed."""

    def work() -> str:
        start = post.visit.read(open_import_start, instrument_id)
        file = post.form.file("original")
        if file is None:
            raise Unacceptable("Choose the file first.", field="original", example="B-2.csv")
        asked = Asked(sheet=post.form.text("sheet"), means=post.form.text("means"))
        read_calibration_file(file.content, start.kind, asked)
        kept = post.act(hand_over, HandOver(instrument_id, file.name, file.base64))
        return f"/instruments/{instrument_id}/imports/{kept}?{urlencode(asked_query(asked))}"

    return post.answer(work, again=Again(_HAND_OVER, open_import_start, (instrument_id,)))


Words = Annotated[str, Query(max_length=200)]


@router.get("/instruments/{instrument_id}/imports/{file_id}")
def confirm_form(
    visit: AtDesk,
    instrument_id: str,
    file_id: str,
    sheet: Words = "",
    means: Words = "",
    table: Words = "",
) -> Response:
    """Show what a file says, to be confirmed."""
    asked = Asked(sheet, means, table)
    return show(
        visit,
        _CONFIRM,
        read_original_of,
        instrument_id,
        file_id,
        finish=lambda read: import_page(read, asked),
        with_page=lambda page: {"typed": page.filled},
    )


@router.post("/instruments/{instrument_id}/imports/{file_id}")
def confirm(post: Posted, instrument_id: str, file_id: str) -> Response:
    """Record what a person has confirmed of a file, beside the file."""
    form = post.form
    asked = Asked(form.text("sheet"), form.text("means"), form.text("table"))

    def work() -> str:
        page = import_page(post.visit.read(read_original_of, instrument_id, file_id), asked)
        _need_same(page, form.text("same_instrument"))
        command = read_calibration_form(form, instrument_id, page.kind, file_id=file_id)
        post.act(record_calibration, command)
        return f"/instruments/{instrument_id}"

    again = Again(
        _CONFIRM,
        read_original_of,
        (instrument_id, file_id),
        finish=lambda read: import_page(read, asked),
    )
    return post.answer(work, again=again)


def _need_same(page: ImportPage, ticked: str) -> None:
    if page.another and not ticked:
        says = f"{page.another} Tick that it is, or hand over another file."
        raise Unacceptable(says, field="same_instrument")
