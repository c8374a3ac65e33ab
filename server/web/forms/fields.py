"""From the fields of forms to the documents that commands take."""

import re
from typing import Any

from server.lab.refusal import Unacceptable
from server.web.forms.typed import Typed

_STATEMENTS = frozenset({"u", "U", "half_width"})


def form_field(field: str | None) -> str | None:
    """Return the name of the form's field for a path in a document."""
    if field is None:
        return None
    path = re.sub(r"\[\d+\]", "", field.removeprefix("document."))
    head, _, tail = path.partition(".")
    if tail in _STATEMENTS:
        return f"{head}_bound"
    if head in {"steps", "limits"} or not tail:
        return head
    return f"{head}_{tail}"


def quantity(form: Typed, name: str) -> dict[str, Any] | None:
    """Return a quantity with its statement of uncertainty, or None where nothing was typed."""
    value, bound = form.decimal(f"{name}_value"), form.decimal(f"{name}_bound")
    if not value and not bound:
        return None
    read: dict[str, Any] = {}
    if value:
        read["value"] = value
    if form.text(f"{name}_unit"):
        read["unit"] = form.text(f"{name}_unit")
    if bound:
        read |= _statement(form, name, bound)
    if form.text(f"{name}_source").strip():
        read["source"] = form.text(f"{name}_source").strip()
    return read


def _statement(form: Typed, name: str, bound: str) -> dict[str, str]:
    kind = form.text(f"{name}_statement")
    if kind == "u":
        return {"u": bound}
    if kind == "half_width":
        return {"half_width": bound, "shape": form.text(f"{name}_shape", "rectangular")}
    return {"U": bound, "k": form.decimal(f"{name}_k") or "2"}


def table(form: Typed, name: str) -> list[list[str]] | None:
    """Return a table of two columns, typed a row a line, or None where nothing was typed.

    Raises:
        Unacceptable: a line does not hold two numbers.
    """
    rows = []
    for number, line in enumerate(form.text(name).splitlines(), start=1):
        cells = [cell for cell in re.split(r"[\s;]+", line.strip()) if cell]
        if not cells:
            continue
        if len(cells) != 2:
            says = f"Line {number} of the table does not hold two numbers: “{line.strip()[:40]}”."
            raise Unacceptable(says, field=name, example="10.00  -0.008")
        rows.append([cell.replace(",", ".") if "." not in cell else cell for cell in cells])
    return rows or None
