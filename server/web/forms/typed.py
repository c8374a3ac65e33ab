"""What a form held, exactly as typed; and the files that came with it."""

import base64
from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Annotated, Any
from urllib.parse import parse_qsl

from fastapi import Depends, Request
from starlette.datastructures import UploadFile
from starlette.exceptions import HTTPException

from server.lab.refusal import Unacceptable
from server.web.refusals import Unreadable, WrongKind

_KIND = "application/x-www-form-urlencoded"
_WITH_FILES = "multipart/form-data"
_MOST_FIELDS = 500
_MOST_FILES = 3
_MANY = frozenset({"roles", "accepted", "bottles", "pictograms", "scopes"})
_UNSEEN = frozenset({"form_token", "key", "revision", "next", "version"})
_SECRET = frozenset({"password", "old", "new", "setup_code"})


@dataclass(frozen=True, slots=True)
class SentFile:
    """A file of a form: the name that the browser gave it, and its bytes."""

    name: str
    content: bytes = field(repr=False)

    @property
    def base64(self) -> str:
        """The bytes as text, as commands carry them."""
        return base64.b64encode(self.content).decode("ascii")


@dataclass(frozen=True, slots=True)
class Typed:
    """The fields of a form; a field that is absent is an empty text."""

    values: Mapping[str, tuple[str, ...]]
    files: Mapping[str, SentFile] = field(default_factory=dict)

    def file(self, name: str) -> SentFile | None:
        """Return the file of a field, None where none was chosen."""
        return self.files.get(name)

    def text(self, name: str, default: str = "") -> str:
        """Return a field's text as typed."""
        return self.values.get(name, (default,))[-1]

    def all(self, name: str) -> tuple[str, ...]:
        """Return all values of a field that may be there several times."""
        return self.values.get(name, ())

    def whole(self, name: str, *, example: str) -> int:
        """Return a whole number.

        Raises:
            Unacceptable: it is none.
        """
        text = self.text(name).strip()
        if not (text.isascii() and text.isdigit() and len(text) < 10):
            raise Unacceptable(f"{name} must be a whole number.", field=name, example=example)
        return int(text)

    def decimal(self, name: str) -> str:
        """Return a number as typed, its one decimal comma written as a point."""
        text = self.text(name).strip()
        return text.replace(",", ".") if text.count(",") == 1 and "." not in text else text

    def shown(self) -> dict[str, Any]:
        """Return what a form that is shown again holds; passwords are typed anew."""
        return {
            name: list(values) if name in _MANY else values[-1]
            for name, values in self.values.items()
            if name not in _SECRET and name not in {"form_token", "key"}
        }

    def lines(self) -> tuple[tuple[str, str], ...]:
        """Return what a person typed, field by field, to be copied."""
        return tuple(
            (name, value)
            for name, values in self.values.items()
            if name not in _SECRET and name not in _UNSEEN
            for value in values
            if value.strip()
        )


async def read_typed(request: Request) -> Typed:
    """Return what a form held.

    Raises:
        WrongKind: the body is no form.
        Unreadable: it is not UTF-8, or holds a character that no text has.
    """
    kind = request.headers.get("content-type", "").partition(";")[0].strip().lower()
    if kind == _WITH_FILES:
        pairs, files = await _parts(request)
    elif kind == _KIND:
        pairs, files = await _pairs(request), {}
    else:
        raise WrongKind("A form is expected here.", example=_KIND)
    values: dict[str, tuple[str, ...]] = {}
    for name, value in pairs:
        if "\0" in name or "\0" in value:
            raise Unreadable("A field holds a character that no text has.", field=name[:40])
        values[name] = (*values.get(name, ()), value.replace("\r\n", "\n"))
    typed = Typed(MappingProxyType(values), MappingProxyType(files))
    request.state.typed_lines = typed.lines()
    return typed


async def _pairs(request: Request) -> list[tuple[str, str]]:
    try:
        body = (await request.body()).decode("utf-8")
        return parse_qsl(body, keep_blank_values=True, errors="strict", max_num_fields=_MOST_FIELDS)
    except (UnicodeDecodeError, ValueError) as problem:
        raise Unreadable("This form cannot be read.") from problem


async def _parts(request: Request) -> tuple[list[tuple[str, str]], dict[str, SentFile]]:
    """Return the fields and files of a form that holds files; the guards bound its size."""
    pairs: list[tuple[str, str]] = []
    files: dict[str, SentFile] = {}
    try:
        async with request.form(max_files=_MOST_FILES, max_fields=_MOST_FIELDS) as form:
            for name, value in form.multi_items():
                if not isinstance(value, UploadFile):
                    pairs.append((name, value))
                elif value.filename:
                    files[name] = SentFile(value.filename, await value.read())
    except (HTTPException, UnicodeDecodeError) as problem:
        raise Unreadable("This form cannot be read.") from problem
    return pairs, files


TypedForm = Annotated[Typed, Depends(read_typed)]
