"""The self-check as a PDF: published cases beside what this program computes."""

import json
from collections.abc import Sequence

import typst

from server.evaluation.published import Check

_TEMPLATE = """
#let told = json(bytes(sys.inputs.told))
#set page(paper: "a4", margin: 18mm, numbering: "1 / 1")
#set text(size: 9pt)
#set document(title: "Self-check")
= Self-check of the calculations
Program #told.release, on #told.day. #told.says
#table(
  columns: (1.6fr, 1.4fr, 1fr, 1fr, 1fr, auto),
  inset: 4pt,
  stroke: 0.4pt + luma(160),
  table.header([*source*], [*what*], [*published*], [*computed*], [*agreement*], [*holds*]),
  ..told.rows.flatten().map(cell => [#cell])
)
"""


def selfcheck_pdf(checks: Sequence[Check], *, release: str, day: str, says: str) -> bytes:
    """Return the PDF of a self-check: a line for each published case, and what it comes to."""
    rows = [
        [
            one.source, one.what, one.published, one.computed, one.agreement,
            "yes" if one.holds else "NO",
        ]
        for one in checks
    ]  # fmt: skip
    told = json.dumps({"release": release, "day": day, "says": says, "rows": rows})
    pdf: bytes = typst.compile(_TEMPLATE.encode(), sys_inputs={"told": told})
    return pdf
