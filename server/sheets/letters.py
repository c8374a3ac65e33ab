"""What is to be written by e-mail: the changes of watched things that no letter tells yet."""

from dataclasses import dataclass
from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.watching import Change, changes
from server.records.queries.list_letters import written_until
from server.records.queries.list_watches import Posted, posted_watches
from server.records.queries.load_papers import load_laboratory_fact
from server.sheets.notices_page import path_of, title_of
from server.sheets.parts.changes import change_words
from server.sheets.parts.telling import moment_words


@dataclass(frozen=True, slots=True)
class LetterDraft:
    """A letter about one change, not kept yet."""

    watch_id: str
    changed_at: datetime
    address: str
    subject: str
    body: str


def open_letters(session: Session, *, now: datetime) -> tuple[LetterDraft, ...]:
    """Return the letters that are to be written, the oldest change first."""
    posted = posted_watches(session)
    if not posted:
        return ()
    laboratory = load_laboratory_fact(session)
    written = written_until(session, [one.watched.watch.id for one in posted])
    site = str(laboratory.settings.get("base_url") or "").rstrip("/")
    drafts = []
    for one in posted:
        since = max(one.since, written.get(one.watched.watch.id, one.since))
        drafts += [
            _draft(one, change, zone=laboratory.zone, signed=laboratory.name, site=site)
            for change in changes(one.watched.history, since=since, until=now)
        ]
    return tuple(sorted(drafts, key=lambda draft: (draft.changed_at, draft.watch_id)))


def _draft(one: Posted, change: Change, *, zone: str, signed: str, site: str) -> LetterDraft:
    title = title_of(one.watched)
    lines = [
        f"{title}: {change.after.state}.",
        "",
        change_words(change, zone),
        f"Changed {moment_words(change.at, zone)} ({zone}).",
    ]
    if site:
        lines += ["", f"{site}{path_of(one.watched)}"]
    lines += ["", f"{signed}. You watch this; open its page to stop."]
    return LetterDraft(
        watch_id=one.watched.watch.id,
        changed_at=change.at,
        address=one.address,
        subject=" ".join(f"{title}: {change.after.state}".split()),
        body="\n".join(lines) + "\n",
    )
