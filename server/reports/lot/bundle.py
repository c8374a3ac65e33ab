"""All of a lot that leaves the laboratory in one archive, as plain values."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any

from server.lab.ink import WrittenEntry
from server.reports.issued import Issued


@dataclass(frozen=True, slots=True)
class OriginalFile:
    """A file as it was brought in, and which papers or curves it belongs to, in words."""

    name: str
    media_type: str
    sha256: str
    content: bytes = field(repr=False)
    papers: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class WrittenSheet:
    """A bench sheet of the lot: its number, state, and all entries, also those struck through."""

    number: str
    state: str
    entries: tuple[WrittenEntry, ...]


@dataclass(frozen=True, slots=True)
class LotBundle:
    """A lot with its certificates (the newest first), sheets, trail (oldest first) and files.

    ``trail`` rows hold all that their hashes are made of. ``paper_hashes`` maps calibrations and
    standard lots, by id, to the SHA-256 of their files. ``country`` is the laboratory's; where it
    is empty no DCC is made.
    """

    code: str
    name: str
    titrant: str
    laboratory: str
    as_of: datetime
    certificates: Sequence[Issued]
    sheets: Sequence[WrittenSheet]
    bottles: Sequence[Mapping[str, Any]]
    trail: Sequence[Mapping[str, Any]] = field(repr=False)
    files: Sequence[OriginalFile] = ()
    paper_hashes: Mapping[str, str] = field(default_factory=dict)
    country: str = ""
