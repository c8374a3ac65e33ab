"""A change of a bottle or lot in a sentence."""

from server.lab.states import (
    CHECK_DUE,
    HELD,
    IN_FORCE,
    LAPSED,
    PULLED,
    UNPROVEN,
    USED_UP,
    may_be_used,
)
from server.lab.watching import Change, Status
from server.sheets.parts.telling import last_day_words

_STATES = {
    IN_FORCE: "In force.",
    CHECK_DUE: "Check due: still in force, but to be standardized again soon.",
    LAPSED: "Lapsed: do not use it until it is standardized again.",
    UNPROVEN: "Unproven: no certificate carries its concentration.",
    HELD: "Held: do not use it until somebody has released it.",
    PULLED: "Pulled: out of use for good.",
    USED_UP: "Used up.",
}


def change_words(change: Change, zone: str) -> str:
    """Return what changed: the state, the number, the date, and the reason where one was given."""
    before, after = change.before, change.after
    said = [] if before.state == after.state else [_STATES[after.state]]
    if change.why:
        end = "" if change.why.endswith((".", "!", "?")) else "."
        said.append(f"Why: {change.why}{end}")
    if before.certificate != after.certificate:
        said.append(_new_number(before, after))
    if after.good_until and before.good_until != after.good_until:
        said.append(_date(before, after, zone))
    elif after.good_until and after.state != before.state and may_be_used(after.state):
        said.append(f"Good until {last_day_words(after.good_until, zone)}.")
    return " ".join(said)


def _new_number(before: Status, after: Status) -> str:
    says = f"Certificate {after.certificate}: {after.reported}"
    if not before.certificate:
        return f"{says}."
    return f"{says}, in place of {before.certificate}: {before.reported}."


def _date(before: Status, after: Status, zone: str) -> str:
    if after.good_until is None:
        return ""
    says = f"Good until {last_day_words(after.good_until, zone)}"
    if before.good_until is None:
        return f"{says}."
    return f"{says}, before: {last_day_words(before.good_until, zone)}."
