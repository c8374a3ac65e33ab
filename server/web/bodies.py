"""JSON bodies: read strictly into commands, and described in the API's own document."""

from collections.abc import Mapping, Sequence
from dataclasses import MISSING, fields
from typing import Any, get_type_hints

from fastapi import Request
from pydantic import BaseModel, ConfigDict, ValidationError, create_model
from pydantic_core import ErrorDetails

from server.lab.refusal import Refusal, Unacceptable
from server.web.refusals import Unreadable, WrongKind

Given = dict[str, Any]
_EXAMPLES = {
    "string": '"18.60"',
    "integer": "1",
    "boolean": "true",
    "array": "[]",
    "object": "{}",
}


def model_of(
    command: type, *, without: Sequence[str] = (), also: Mapping[str, Any] | None = None
) -> type[BaseModel]:
    """Return the model of a command's JSON: its fields but those that the address holds.

    ``also``: fields beside them, each with its type, or with its type and default.
    """
    hints = get_type_hints(command)
    shape: dict[str, Any] = {}
    for one in fields(command):
        if one.name in without:
            continue
        default: Any = ...
        if one.default is not MISSING:
            default = one.default
        elif one.default_factory is not MISSING:
            default = one.default_factory()
        shape[one.name] = (hints[one.name], default)
    for name, kind in (also or {}).items():
        shape[name] = kind if isinstance(kind, tuple) else (kind, ...)
    config = ConfigDict(extra="forbid", strict=True)
    model: type[BaseModel] = create_model(command.__name__, __config__=config, **shape)
    return model


class JsonBody:
    """Reads a request's JSON into the fields of a model; a dependency of routes."""

    def __init__(self, model: type[BaseModel]) -> None:
        self.model = model

    @property
    def openapi(self) -> dict[str, Any]:
        """What the API's document says of this body."""
        schema = self.model.model_json_schema(ref_template="#/$defs/{model}")
        return {
            "requestBody": {"required": True, "content": {"application/json": {"schema": schema}}}
        }

    async def __call__(self, request: Request) -> Given:
        """Return the fields of the body.

        Raises:
            WrongKind: the body is no JSON by its own word.
            Unreadable: it is no JSON after all.
            Unacceptable: an unknown key, a missing one, or a value of another kind.
        """
        return read_body(self.model, await json_bytes(request))


def body_of(command: type, *without: str, **also: Any) -> JsonBody:
    """Return the reader of a command's body; ``also`` are fields beside the command's."""
    return JsonBody(model_of(command, without=without, also=also))


async def json_bytes(request: Request) -> bytes:
    """Return the bytes of a JSON body, or refuse another kind."""
    kind = request.headers.get("content-type", "").partition(";")[0].strip().lower()
    if kind != "application/json":
        raise WrongKind("JSON is expected here.", example="Content-Type: application/json")
    return await request.body()


def read_body(model: type[BaseModel], body: bytes) -> Given:
    """Return the fields of a JSON text, strictly."""
    try:
        read = model.model_validate_json(body)
    except ValidationError as problem:
        raise _refusal(model, problem.errors()[0]) from None
    given = {name: getattr(read, name) for name in model.model_fields}
    _need_text(given, "")
    return given


def _refusal(model: type[BaseModel], problem: ErrorDetails) -> Refusal:
    if problem["type"] == "json_invalid":
        return Unreadable(f"This is no JSON: {problem['ctx']['error']}.", example="{}")
    path = _path(problem["loc"])
    where = path or "The body"
    if problem["type"] == "extra_forbidden":
        known = ", ".join(model.model_fields)
        hint = f"; known are {known}" if len(problem["loc"]) == 1 else ""
        return Unacceptable(
            f"{where} is not known here{hint}.", field=path, example=next(iter(model.model_fields))
        )
    example = _example(model, problem["loc"])
    if problem["type"] == "missing":
        return Unacceptable(f"{where} is missing.", field=path, example=example)
    return Unacceptable(f"{where}: {problem['msg']}.", field=path or None, example=example)


def _path(loc: Sequence[int | str]) -> str:
    path = ""
    for part in loc:
        path += f"[{part}]" if isinstance(part, int) else f".{part}" if path else str(part)
    return path


def _example(model: type[BaseModel], loc: Sequence[int | str]) -> str | None:
    schema = model.model_json_schema()
    defs = schema.get("$defs", {})
    for part in loc:
        if "$ref" in schema:
            schema = defs.get(schema["$ref"].rpartition("/")[2], {})
        schema = (
            schema.get("items", {})
            if isinstance(part, int)
            else schema.get("properties", {}).get(part, {})
        )
    options = [schema, *schema.get("anyOf", [])]
    return next((_EXAMPLES[one["type"]] for one in options if one.get("type") in _EXAMPLES), None)


def _need_text(value: Any, path: str) -> None:
    """Refuse a character that no text has: databases do not keep it."""
    if isinstance(value, str) and "\0" in value:
        raise Unacceptable(f"{path} holds a character that no text has.", field=path)
    if isinstance(value, BaseModel):
        value = dict(value)
    if isinstance(value, Mapping):
        for name, one in value.items():
            _need_text(str(name), path)
            _need_text(one, f"{path}.{name}" if path else str(name))
    elif isinstance(value, list | tuple):
        for i, one in enumerate(value):
            _need_text(one, f"{path}[{i}]")
