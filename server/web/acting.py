"""Letting procedures act: in one transaction, once for a key, with the time of the act."""

from collections.abc import Callable, Mapping
from dataclasses import asdict, is_dataclass
from typing import Any

from server.procedures.repeats import find_answer, once
from server.web.visits import Visit

#: Fields whose content is never kept, not even as part of a digest.
_SECRET = frozenset({"password"})


def act(
    visit: Visit,
    procedure: Callable[..., Any],
    command: Any,
    *more: Any,
    key: str | None,
    **named: Any,
) -> Any:
    """Let a procedure act for who is here; a repeated key gets the first answer.

    ``key`` None: the request carries none and is done each time. The instant of the act is taken
    inside the transaction, so that times rise with the trail.
    """
    actor, parts = visit.person, visit.parts

    def work(session: Any) -> Any:
        now = parts.clock()

        def do() -> Any:
            return procedure(session, command, *more, actor=actor, now=now, **named)

        if key is None:
            return do()
        body = _asked(procedure, command)
        answer = once(
            session, actor=actor, key=key, body=body, now=now, work=lambda: {"answer": do()}
        )
        return answer["answer"]

    return parts.transactions.write(work)


def first_answer(
    visit: Visit, procedure: Callable[..., Any], command: Any, *, key: str | None
) -> Any:
    """Return the answer that a key got before, or None; for acts that ask much before they write.

    Raises:
        Unacceptable: the key came before with something else.
    """
    if key is None:
        return None
    actor, parts = visit.person, visit.parts
    body = _asked(procedure, command)

    earlier = parts.transactions.read(
        lambda session: find_answer(session, actor=actor, key=key, body=body)
    )
    return earlier.answer["answer"] if earlier is not None else None


def _asked(procedure: Callable[..., Any], command: Any) -> dict[str, Any]:
    """Return what was asked, as the key's digest covers it."""
    given = asdict(command) if is_dataclass(command) and not isinstance(command, type) else command
    kept = {name: value for name, value in _mapping(given).items() if name not in _SECRET}
    return {"act": procedure.__name__, "asked": kept}


def _mapping(given: Any) -> Mapping[str, Any]:
    return given if isinstance(given, Mapping) else {"given": given}
