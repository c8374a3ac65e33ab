"""What bottles were used for, as a CSV file."""

from server.reports.csv_export import write_csv
from server.sheets.uses import UsesView

_HEADS = (
    "result", "bottle", "used at", "certificate", "state then", "written by", "by token",
    "remark", "struck",
)  # fmt: skip


def uses_csv(view: UsesView) -> bytes:
    """Return uses line by line, times in UTC, struck lines among them."""
    rows = [
        (
            one.result_id, one.bottle, one.used_at, one.certificate, one.state_then, one.by,
            one.by_token, one.says, one.struck,
        )
        for one in view.uses
    ]  # fmt: skip
    return write_csv(_HEADS, rows)
