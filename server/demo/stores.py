"""What happens to the demo's standard lots besides being weighed: opened, dried, used by hand."""

import base64
from collections.abc import Mapping
from datetime import datetime, timedelta
from typing import Any

from server.demo.cast import JONAS, Member
from server.demo.hands import Hands
from server.lab.validity import local_day
from server.procedures.standard_lots import (
    OpenStandardLot,
    RecordDrying,
    RecordUse,
    StrikeLotLine,
    open_lot,
    record_drying,
    record_use,
    strike_lot_line,
)

_HOUR = timedelta(hours=1)


def certificate_file(substance: str, stated: Mapping[str, Any]) -> dict[str, Any]:
    """Return a standard lot's certificate as a file: a text, for all of it is invented."""
    fraction = stated["mass_fraction"]
    text = (
        f"{stated['issuer']}\n\nCertificate {stated['certificate_number']}\n"
        f"Primary standard: {substance}\n"
        f"Mass fraction: {fraction['value']}, U = {fraction['U']} (k = {fraction['k']})\n"
        f"Smallest sample: {stated['minimum_sample_g']} g\n\n"
        "Invented for a demonstration laboratory.\n"
    )
    name = f"certificate {stated['certificate_number'].replace('/', '-')}.txt"
    return {"file_name": name, "content_base64": base64.b64encode(text.encode()).decode("ascii")}


def opened(hands: Hands, lot_id: str, member: Member, at: datetime) -> None:
    """Let somebody open a lot."""
    day = local_day(at, hands.zone).isoformat()
    hands.do(open_lot, OpenStandardLot(lot_id, day), member, at)


def dried(hands: Hands, lot_id: str, member: Member, at: datetime, hours: str = "2.0") -> str:
    """Let somebody write a drying that ended half an hour before; return the line's id."""
    command = RecordDrying(
        lot_id,
        ended_at=(at - _HOUR / 2).isoformat(),
        temperature="120",
        hours=hours,
        desiccator=True,
    )
    return hands.do(record_drying, command, member, at)


def dried_with_a_slip(hands: Hands, lot_id: str, member: Member, at: datetime) -> None:
    """Let somebody write a drying wrong, strike it through and write it anew."""
    line = dried(hands, lot_id, member, at - _HOUR / 6, hours="0.2")
    why = "slip of the pen: 2.0 h, not 0.2 h"
    hands.do(strike_lot_line, StrikeLotLine(lot_id, line, why), member, at - _HOUR / 12)
    dried(hands, lot_id, member, at)


def used_by_hand(hands: Hands, lot_id: str, at: datetime) -> None:
    """Let the keeper take some for another purpose."""
    command = RecordUse(lot_id, "1.0213", "loss on drying, on receipt")
    hands.do(record_use, command, JONAS, at)
