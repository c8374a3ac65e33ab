"""What a certificate says otherwise than the one it replaces."""

from typing import Any

from server.reports.issued import Issued
from server.sheets.parts.replacement import changed_lines, why_replaced


def changes_told(issued: Issued) -> dict[str, Any] | None:
    """Return what changed against the replaced certificate, and why; None where it replaces none.

    Without the replaced document only its number is named.
    """
    document, previous = issued.document, issued.previous
    if not document["replaces"]:
        return None
    if previous is None:
        return {"number": document["replaces"], "reason": "", "lines": []}
    return {
        "number": document["replaces"],
        "reason": why_replaced(document, previous),
        "lines": [list(one) for one in changed_lines(previous, document)],
    }
