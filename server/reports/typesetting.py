"""Typesetting: a page's text and what it is told in, PDF or pictures out.

What is told travels as JSON and is shown as text: a page never evaluates it, so that markup in a
name does nothing. Fonts are those that come with the typesetter; a machine's own are asked only
for letters that those lack, and a letter that no font has is printed by its code point.
"""

import json
import re
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from functools import cache
from pathlib import Path
from threading import Lock
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import typst

#: Archival (ISO 19005-3, level a) and accessible (ISO 14289-1).
ARCHIVAL = ("a-3a", "ua-1")
_PAGES = Path(__file__).with_name("pages")
_NO_LETTER = re.compile("could not be displayed|contains the codepoint")
_UNBROKEN = re.compile(r"\S{25,}")
_DIGEST = re.compile(r"[0-9a-f]{64}")
_PIECE = 12
_LOCK = Lock()


class TypesettingProblem(Exception):
    """A page that could not be set; the text is the page's own word for it."""


def set_pdf(
    page: str,
    told: Mapping[str, Any],
    *,
    made_at: datetime,
    files: Mapping[str, str] | None = None,
) -> bytes:
    """Return a page as archival PDF; ``files`` are texts that it attaches, by the page's own word.

    Raises:
        TypesettingProblem: the page refuses what it was told.
    """
    return _fitted(page, told, files or {}, made_at).pdf


def set_pictures(
    page: str, told: Mapping[str, Any], *, made_at: datetime, dots_per_inch: float
) -> list[bytes]:
    """Return the sheets of a page's PDF as PNG pictures.

    Raises:
        TypesettingProblem: the page refuses what it was told.
    """
    fitted = _fitted(page, told, {}, made_at)
    found = _compile(
        page, fitted.told, {}, own_fonts=fitted.own_fonts, format="png", ppi=dots_per_inch
    )
    return found if isinstance(found, list) else [found]


@dataclass(frozen=True, slots=True)
class _Fitted:
    """A PDF, and with what fonts and letters it could be set."""

    pdf: bytes
    told: Mapping[str, Any]
    own_fonts: bool


def _fitted(
    page: str, told: Mapping[str, Any], files: Mapping[str, str], made_at: datetime
) -> _Fitted:
    """Return the PDF with the typesetter's fonts, else the machine's, else with letters spelled."""
    made: dict[str, Any] = {"format": "pdf", "standards": ARCHIVAL, "made_at": made_at}
    for own_fonts in (True, False):
        try:
            pdf = _compile(page, told, files, own_fonts=own_fonts, **made)
        except _LetterMissing:
            continue
        return _Fitted(pdf, told, own_fonts)
    spelled = _spell_out(told)
    try:
        return _Fitted(_compile(page, spelled, files, own_fonts=False, **made), spelled, False)
    except _LetterMissing as problem:
        raise TypesettingProblem(str(problem)) from problem


class _LetterMissing(Exception):
    """A letter that the fonts at hand lack."""


def _compile(
    page: str,
    told: Mapping[str, Any],
    files: Mapping[str, str],
    *,
    own_fonts: bool,
    standards: tuple[str, ...] = (),
    made_at: datetime | None = None,
    **asked: Any,
) -> Any:
    import typst  # noqa: PLC0415 - the first paper loads it, not the start

    inputs = {"told": json.dumps(_breakable(told), ensure_ascii=False), **files}
    if standards:
        asked["pdf_standards"] = list(standards)
    if made_at is not None:
        asked["timestamp"] = int(made_at.timestamp())
    try:
        with _LOCK:  # a compiler serves one caller at a time
            return _compiler(page, own_fonts=own_fonts).compile(sys_inputs=inputs, **asked)
    except typst.TypstError as problem:
        if _NO_LETTER.search(str(problem)):
            raise _LetterMissing(str(problem)) from problem
        raise TypesettingProblem(str(problem)) from problem


@cache
def _compiler(page: str, *, own_fonts: bool) -> "typst.Compiler":
    import typst  # noqa: PLC0415 - the same

    return typst.Compiler(str(_PAGES / f"{page}.typ"), ignore_system_fonts=own_fonts)


def _spell_out(value: Any) -> Any:
    """Return what is told with each letter that no font here has spelled as its code point."""
    letters = {letter for letter in _texts(value) if not " " <= letter <= "~"} - {"\n", "\t"}
    lacking = [letter for letter in sorted(letters) if not _is_shown(letter)]
    table = str.maketrans({letter: f"⟨U+{ord(letter):04X}⟩" for letter in lacking})
    return _translated(value, table)


@cache
def _is_shown(letter: str) -> bool:
    try:
        _compile("letter", {"letter": letter}, {}, own_fonts=False, format="pdf",
                 standards=ARCHIVAL)  # fmt: skip
    except _LetterMissing:
        return False
    return True


def _breakable(value: Any) -> Any:
    """Return texts with places to break in what is long and has no space; digests stay whole."""
    if isinstance(value, Mapping):
        return {key: _breakable(one) for key, one in value.items()}
    if isinstance(value, list | tuple):
        return [_breakable(one) for one in value]
    return _UNBROKEN.sub(_pieces, value) if isinstance(value, str) else value


def _pieces(found: re.Match[str]) -> str:
    text = found.group()
    if _DIGEST.fullmatch(text):
        return text
    return "\u200b".join(text[at : at + _PIECE] for at in range(0, len(text), _PIECE))


def _texts(value: Any) -> str:
    if isinstance(value, Mapping):
        return "".join(_texts(one) for one in value.values())
    if isinstance(value, list | tuple):
        return "".join(_texts(one) for one in value)
    return value if isinstance(value, str) else ""


def _translated(value: Any, table: Mapping[int, str]) -> Any:
    if isinstance(value, Mapping):
        return {key: _translated(one, table) for key, one in value.items()}
    if isinstance(value, list | tuple):
        return [_translated(one, table) for one in value]
    return value.translate(table) if isinstance(value, str) else value
