"""Printing labels: what they say is set first, so that only what can be printed is written down."""

from server.procedures.labels import PrintLabels, prepare_labels, print_labels
from server.reports.labels.printing import print_pdf
from server.web.acting import act, first_answer
from server.web.visits import Visit


def print_them(visit: Visit, command: PrintLabels, *, key: str | None) -> int:
    """Write down that labels are printed, once they were set; return the print's number."""
    earlier = first_answer(visit, print_labels, command, key=key)
    if earlier is not None:
        return int(earlier)
    visit.person  # noqa: B018 - refuses who is not signed in
    ready = visit.read(prepare_labels, command)
    print_pdf(ready.texts, ready.onto, at=visit.now)
    return int(act(visit, print_labels, command, key=key))
