"""States, computed from stored facts and ``now``: what time changes is never stored."""

from datetime import datetime, timedelta

OPEN, HANDED_IN, SENT_BACK = "open", "handed in", "sent back"
COUNTERSIGNED, ABANDONED = "countersigned", "abandoned"

UNPROVEN, IN_FORCE, CHECK_DUE, LAPSED = "unproven", "in force", "check due", "lapsed"
HELD, PULLED, USED_UP = "held", "pulled", "used up"
LOT_STATES = (IN_FORCE, CHECK_DUE, UNPROVEN, LAPSED, HELD, PULLED)
BOTTLE_STATES = (*LOT_STATES, USED_UP)

STANDING, REPLACED = "standing", "replaced"

IN_DATE, DUE_SOON = "in date", "due soon"
DUE_NOTICE_DAYS = 30


def sheet_state(
    *,
    handed_in_at: datetime | None,
    sent_back_at: datetime | None,
    countersigned_at: datetime | None,
    abandoned_at: datetime | None,
) -> str:
    """Return a bench sheet's state.

    The instants of a sheet that is taken up again after it was sent back are cleared by the
    first entry, so that it is open once more.
    """
    if abandoned_at:
        return ABANDONED
    if countersigned_at:
        return COUNTERSIGNED
    if sent_back_at:
        return SENT_BACK
    return HANDED_IN if handed_in_at else OPEN


def lot_state(
    *,
    valid_until: datetime | None,
    notice_days: int,
    held: bool,
    pulled: bool,
    now: datetime,
) -> str:
    """Return a lot's state; ``valid_until`` is that of its standing certificate, or None."""
    if pulled:
        return PULLED
    if held:
        return HELD
    if valid_until is None:
        return UNPROVEN
    if now >= valid_until:
        return LAPSED
    if now >= valid_until - timedelta(days=notice_days):
        return CHECK_DUE
    return IN_FORCE


def bottle_state(lot: str, *, held: bool, used_up: bool) -> str:
    """Return the graver of the lot's state and the bottle's own."""
    own = USED_UP if used_up else HELD if held else IN_FORCE
    return max(lot, own, key=BOTTLE_STATES.index)


def may_be_used(state: str) -> bool:
    """Say whether a bottle or lot in this state is in force (a check that is due still is)."""
    return state in {IN_FORCE, CHECK_DUE}


def certificate_state(*, replaced: bool, pulled: bool) -> str:
    """Return a certificate's state; a pulled lot takes its standing certificate with it."""
    if replaced:
        return REPLACED
    return PULLED if pulled else STANDING


def due_state(
    *, due_at: datetime, held: bool, now: datetime, notice_days: int = DUE_NOTICE_DAYS
) -> str:
    """Return the state of a standard lot or a calibration: in date, due soon, lapsed or held."""
    if held:
        return HELD
    if now >= due_at:
        return LAPSED
    return DUE_SOON if now >= due_at - timedelta(days=notice_days) else IN_DATE
