"""The numbered notes of a certificate: corrections, what was left out, accepted findings."""

from collections.abc import Iterator, Mapping
from datetime import datetime
from typing import Any

from server.sheets.parts.telling import moment_words, unit_words


class Notes:
    """Notes in the order of the pages, and which figures carry their marks."""

    def __init__(self, document: Mapping[str, Any], zone: str) -> None:
        self._zone = zone
        self._texts: list[str] = []
        self._of_entry: dict[tuple[Any, ...], list[str]] = {}
        self._of_finding: dict[str, list[str]] = {}
        for one in document["corrections"]:
            self._note(self._of_entry, _place(one), self._correction(one))
        for one in document["replicates_left_out"]:
            self._texts.append(self._left_out(one))
        for one in document["findings"]:
            says = "; ".join(_accepted(one, document["signatures"]))
            if says:
                self._note(self._of_finding, one["name"], f"Finding “{one['name']}”: {says}.")
        for one in document["entries"]:
            if one["slot"] == "remark":
                self._texts.append(f"{_where(one)}, remark: {one['text']} ({one['by']})")

    def add(self, text: str) -> str:
        """Add a note at the end and return its mark."""
        self._texts.append(text)
        return str(len(self._texts))

    def of_entry(self, entry: Mapping[str, Any]) -> list[str]:
        """Return the marks of an entry."""
        return self._of_entry.get(_place(entry), [])

    def of_finding(self, name: str) -> list[str]:
        """Return the marks of a finding."""
        return self._of_finding.get(name, [])

    def told(self) -> list[list[str]]:
        """Return the notes with their marks."""
        return [[str(number), text] for number, text in enumerate(self._texts, start=1)]

    def _note(self, marks: dict[Any, list[str]], key: Any, text: str) -> None:
        marks.setdefault(key, []).append(self.add(text))

    def _correction(self, one: Mapping[str, Any]) -> str:
        unit = f" {unit_words(one['unit'])}" if one["unit"] else ""
        now = f"{one['now']}{unit}" if one["now"] else "nothing in its place"
        return (
            f"{_where(one)}, {one['label']}: {one['was']}{unit} ({one['was_by']}, "
            f"{self._at(one['was_at'])}) struck through, {now} written by {one['by']}, "
            f"{self._at(one['at'])}. Reason: {one['reason']}"
        )

    def _left_out(self, one: Mapping[str, Any]) -> str:
        return (
            f"Replicate {one['replicate']} left out of the mean by {one['by']}, "
            f"{self._at(one['at'])}: {one['criterion']}. Reason: {one['reason']}"
        )

    def _at(self, at: str) -> str:
        return moment_words(datetime.fromisoformat(at), self._zone)


def _place(one: Mapping[str, Any]) -> tuple[Any, ...]:
    return one["replicate"], one["slot"], one["segment"]


def _where(one: Mapping[str, Any]) -> str:
    return f"Replicate {one['replicate']}" if one["replicate"] else "Sheet"


def _accepted(finding: Mapping[str, Any], signatures: list[Mapping[str, Any]]) -> Iterator[str]:
    if finding["reason"]:
        by = next((one["printed_name"] for one in signatures if one["meaning"] == "measured"), "")
        yield f"reason given by {by}: {finding['reason']}"
    if finding["accepted_by"]:
        yield f"accepted by {finding['accepted_by']}"
