"""Uses of bottles with the state that each bottle had when it was used."""

from collections.abc import Mapping, Sequence
from datetime import date, datetime, time

from server.lab.states import PULLED, may_be_used
from server.lab.validity import read_zone
from server.lab.watching import History, status_at
from server.records.queries.list_bottle_uses import KeptUse
from server.sheets.parts.telling import count_words, day_words, moment_words
from server.sheets.uses import UseLine, UsesView

MOST = 500


def uses_view(
    kept: Sequence[KeptUse],
    histories: Mapping[str, History],
    *,
    since: date | None,
    most: int | None,
    zone: str,
    may_write: bool,
) -> UsesView:
    """Return the uses from a day on, all where there is none; struck ones stay readable.

    ``most``: so many are shown, the last ones; all where it is None.
    """
    begin = begin_of(since, zone) if since else None
    shown = [one for one in kept if begin is None or one.row.used_at >= begin]
    lines = tuple(_line(one, histories, zone) for one in shown[:most])
    return UsesView(
        uses=lines,
        says=_says(lines, len(shown), since),
        since=since.isoformat() if since else "",
        may_write=may_write,
    )


def begin_of(day: date, zone: str) -> datetime:
    """Return the instant at which a local day begins."""
    return datetime.combine(day, time(), tzinfo=read_zone(zone))


def _line(one: KeptUse, histories: Mapping[str, History], zone: str) -> UseLine:
    row = one.row
    state = status_at(histories[row.bottle_id], row.used_at).state
    struck = f"Struck by {one.struck_by}: {one.struck_why}" if one.struck_by else ""
    return UseLine(
        id=row.id,
        bottle=one.bottle,
        result_id=row.result_id,
        certificate=row.certificate_number,
        used=moment_words(row.used_at, zone),
        used_at=row.used_at.isoformat(),
        state_then=state,
        in_force_then=may_be_used(state),
        says=row.says,
        by=one.by,
        by_token=one.token,
        struck=struck,
    )


def _says(lines: Sequence[UseLine], all_of_them: int, since: date | None) -> str:
    standing = [one for one in lines if not one.struck]
    when = f" since {day_words(since)}" if since else ""
    if not standing:
        return f"Nobody wrote down a use{when}."
    people = len({one.by for one in standing})
    who = count_words(people, "person", "people")
    says = f"{count_words(len(standing), 'use')}{when}, by {who}."
    late = sum(1 for one in standing if one.state_then == PULLED)
    out = sum(1 for one in standing if not one.in_force_then) - late
    if late:
        says += f" {late} of them after the lot was pulled."
    if out:
        says += f" {out} while the bottle was not in force."
    if all_of_them > len(lines):
        says += f" The last {MOST} are shown; the CSV file holds all."
    return says
