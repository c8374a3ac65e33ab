"""One titrant lot: preparation, bottles, sheets, certificates; and the form for a new one."""

from collections.abc import Mapping, Sequence
from datetime import date, datetime

from sqlalchemy.orm import Session

from server.chemistry.cautions import DEFERRAL
from server.chemistry.reactions import RATIOS
from server.chemistry.substances import name_of
from server.lab.actor import Actor
from server.lab.roles import Act
from server.lab.segregation import pull_refusal
from server.lab.states import PULLED
from server.lab.validity import local_day, read_day
from server.records.queries.list_certificates import KeptCertificate, certificates_of_lot
from server.records.queries.list_sheets import sheets_of_lot
from server.records.queries.list_shelf import (
    bottles_of_lot,
    last_pull,
    lot_names_like,
    lot_on_shelf,
)
from server.records.queries.list_stores import newest_recipes
from server.records.queries.list_watches import LOT, standing_watch
from server.records.queries.load_papers import load_people
from server.records.tables.lots import Lot, Pull
from server.sheets.lots import LotPage, MakeUpPage
from server.sheets.parts.by_code import find_lot
from server.sheets.parts.doors import may_hold, may_release, need_reader
from server.sheets.parts.history import history_chart, history_lines
from server.sheets.parts.roots import caution_views
from server.sheets.parts.sheet_lines import lot_words, sheet_line
from server.sheets.parts.shelf_state import (
    bottle_line,
    held_says,
    nominal_words,
    state_of_lot,
    why,
)
from server.sheets.parts.telling import count_words, moment_words, typed_day_words
from server.sheets.stores import Fact
from server.sheets.uses_page import lot_uses

_LETTERS = "ABCDEFGHIJKLMNOPQRSTUVWXYZ"


def open_lot(
    session: Session,
    code: str,
    *,
    actor: Actor | None,
    now: datetime,
    since: str | None = None,
) -> LotPage:
    """Return a lot by its own code or that of one of its bottles.

    ``since``: the day from which its uses are listed, empty for all. Where it is not given and the
    lot is pulled, or to be pulled, they begin with the certificate that stood last.

    Raises:
        Unacceptable: ``since`` is no day.
        NotFound: no lot has this code; ``shown["nearest"]`` holds codes close to it.
        NotSignedIn: a visitor.
    """
    reader = need_reader(actor)
    lot = find_lot(session, code)
    zone, on_shelf = reader.zone, lot_on_shelf(session, lot.id)
    state = state_of_lot(on_shelf, now)
    certificates = certificates_of_lot(session, lot.id)
    certified = _certified(certificates)
    pull = last_pull(session, lot.id)
    people = load_people(session, _named(lot, pull))
    names = {key: one.printed_name for key, one in people.items()}
    open_pull = pull if pull is not None and pull.confirmed_at is None else None
    usable = state != PULLED
    day = _since(since, certificates if pull is not None else (), zone)
    held = held_says(on_shelf.hold, "lot", zone)
    return LotPage(
        id=lot.id,
        code=lot.code,
        name=lot.name,
        title=lot_words(lot),
        state=state,
        why=held or why(on_shelf, state, zone, thing="lot"),
        facts=_facts(lot, names, zone),
        bottles=tuple(bottle_line(one, now, zone) for one in bottles_of_lot(session, on_shelf)),
        sheets=tuple(
            sheet_line(one, zone, certified=certified.get(one.sheet.id, ""))
            for one in sheets_of_lot(session, lot.id)
        ),
        certificates=history_lines(certificates, zone),
        history_chart=history_chart(certificates, zone),
        may_bottle=usable and reader.may(Act.BOTTLE),
        may_hold=usable and may_hold(reader, on_shelf.hold),
        may_release=may_release(reader, on_shelf.hold),
        may_standardize=usable and reader.may(Act.WRITE),
        may_propose_pull=usable and open_pull is None and reader.may(Act.PROPOSE_PULL),
        may_confirm_pull=(
            open_pull is not None
            and reader.may(Act.CONFIRM_PULL)
            and pull_refusal(open_pull.proposed_by, reader.person_id) is None
        ),
        pull_says=_pull_says(pull, names, zone),
        watching=standing_watch(session, reader.person_id, LOT, lot.id) is not None,
        uses=lot_uses(session, lot.id, since=day, reader=reader),
        use_days=_use_days(certificates, pull, zone),
    )


def open_make_up(session: Session, *, actor: Actor | None, now: datetime) -> MakeUpPage:
    """Return what the form for a new lot offers: titrants with a recipe first, and a free name.

    Raises:
        NotSignedIn: a visitor.
        NotAllowed: somebody who may not make up lots.
    """
    reader = need_reader(actor)
    reader.need(Act.MAKE_UP)
    with_recipe = [one.titrant for one in newest_recipes(session)]
    known = sorted({titrant for titrant, _ in RATIOS})
    day = local_day(now, reader.zone).isoformat()
    titrants = tuple(dict.fromkeys([*with_recipe, *known]))
    return MakeUpPage(
        titrants=tuple((key, f"{key}, {name_of(key)}") for key in titrants),
        proposed_name=_free_name(day, lot_names_like(session, day)),
        cautions=caution_views(titrants),
        deferral=DEFERRAL,
    )


def _free_name(day: str, taken: set[str]) -> str:
    """Return the day with the first letter that no lot of the day has, else with a number."""
    names = [f"{day} {letter}" for letter in _LETTERS]
    names += [f"{day} {number}" for number in range(27, 28 + len(taken))]
    return next(name for name in names if name not in taken)


def _named(lot: Lot, pull: Pull | None) -> set[str]:
    named = {lot.made_by}
    if pull is not None:
        named |= {pull.proposed_by, pull.confirmed_by or pull.proposed_by}
    return named


def _certified(certificates: Sequence[KeptCertificate]) -> dict[str, str]:
    """Return what each sheet's certificate says."""
    return {
        one.row.sheet_id: (
            f"{one.row.number}: {one.document['result']['concentration']['reported']}"
        )
        for one in certificates
    }


def _facts(lot: Lot, names: Mapping[str, str], zone: str) -> tuple[Fact, ...]:
    held = lot.document
    facts = (
        Fact("Titrant", f"{lot.titrant}, {name_of(lot.titrant)}"),
        Fact("Nominal", nominal_words(lot.nominal)),
        Fact("Medium", lot.medium),
        Fact("Made up on", typed_day_words(held.get("prepared_on"))),
        Fact("Made from", str(held.get("made_from") or "")),
        Fact("Preparation", "; ".join(held.get("preparation") or ())),
        Fact("By recipe", str(held.get("recipe_name") or "")),
        Fact("Use by", typed_day_words(held.get("use_by"))),
        Fact("Once open", _once_open(held.get("opened_days"))),
        Fact("Written", f"{moment_words(lot.made_at, zone)} by {names[lot.made_by]}"),
    )
    return tuple(fact for fact in facts if fact.value)


def _once_open(days: str | None) -> str:
    return f"a bottle keeps {count_words(int(days), 'day')}" if days else ""


def _since(asked: str | None, certificates: Sequence[KeptCertificate], zone: str) -> date | None:
    if asked is not None:
        return read_day(asked, "since") if asked.strip() else None
    return local_day(certificates[0].row.issued_at, zone) if certificates else None


def _use_days(
    certificates: Sequence[KeptCertificate], pull: Pull | None, zone: str
) -> tuple[tuple[str, str], ...]:
    """Return the days from which one may want to know who used the lot, newest first."""
    days = [
        (local_day(one.row.issued_at, zone).isoformat(), f"since {one.row.number}")
        for one in certificates
    ]
    if pull is not None and pull.confirmed_at is not None:
        days.insert(0, (local_day(pull.confirmed_at, zone).isoformat(), "since it was pulled"))
    return tuple(days)


def _pull_says(pull: Pull | None, names: Mapping[str, str], zone: str) -> str:
    if pull is None:
        return ""
    proposed = f"{names[pull.proposed_by]} proposed on {moment_words(pull.proposed_at, zone)}"
    says = f"{proposed} to take this lot out of use for good: {pull.reason}."
    if pull.confirmed_at is None or pull.confirmed_by is None:
        return f"{says} A countersigner confirms it."
    at = moment_words(pull.confirmed_at, zone)
    return f"{says} {names[pull.confirmed_by]} confirmed it on {at}."
