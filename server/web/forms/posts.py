"""A form that was sent: its token checked, its act done once, or shown again as it was typed."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Annotated, Any

from fastapi import Depends, Response
from fastapi.responses import RedirectResponse

from server.lab.refusal import KeyMissing, Refusal
from server.web.acting import act
from server.web.errors import answer_of, headers_of
from server.web.forms.field_words import in_words
from server.web.forms.fields import form_field
from server.web.forms.typed import Typed, TypedForm
from server.web.refusals import NotFromHere
from server.web.showing import problem_of, show
from server.web.visits import AtDesk, Visit


@dataclass(frozen=True, slots=True)
class Again:
    """The page that a refused form is shown on: its template, its opener, what that is given.

    ``keeps_typed`` False: the page has several forms, and this one held nothing that was typed;
    ``finish`` makes the page of what was opened; ``more`` is what the page is told besides.
    """

    template: str
    open_page: Callable[..., Any]
    given: tuple[Any, ...] = ()
    keeps_typed: bool = True
    finish: Callable[[Any], Any] | None = None
    more: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Post:
    """A form sent by who is here."""

    visit: Visit
    form: Typed

    def answer(self, work: Callable[[], str], *, again: Again | None = None) -> Response:
        """Do the work and lead on to the address that it returns.

        A refusal shows the form again with what was typed; where it has no page of its own, or that
        page is not for who is here, the problem page lists what was typed.
        """
        self.visit.person  # noqa: B018 - refuses who is not signed in
        try:
            self.need_token()
            return see_other(work())
        except Refusal as refusal:
            if again is None:
                raise
            return self._again(refusal, again)

    def act(self, procedure: Callable[..., Any], command: Any, *more: Any, **named: Any) -> Any:
        """Let a procedure act once for this form's key."""
        return act(self.visit, procedure, command, *more, key=self.key, **named)

    @property
    def key(self) -> str:
        """The form's idempotency key.

        Raises:
            KeyMissing: it has none.
        """
        key = self.form.text("key")
        if not key:
            raise KeyMissing("This form came without its key; open the page again.", field="key")
        return key

    def need_token(self) -> None:
        """Refuse a form that does not carry the token of this session."""
        if not self.visit.holds_token(self.form.text("form_token")):
            says = (
                "This form belongs to another session: it was opened before you signed in, or "
                "elsewhere. Look it over and send it again."
            )
            raise NotFromHere(says)

    def _again(self, refusal: Refusal, again: Again) -> Response:
        typed = self.form.shown() if again.keeps_typed else {}
        typed.update(refusal.shown.get("typed", {}))
        try:
            return show(
                self.visit,
                again.template,
                again.open_page,
                *again.given,
                finish=again.finish,
                status=answer_of(refusal).status,
                headers=headers_of(refusal),
                problem=problem_of(in_words(refusal), form_field(refusal.field)),
                typed=typed,
                **again.more,
            )
        except Refusal:
            raise refusal from None


def see_other(url: str) -> Response:
    """Lead on to a page after a form was taken."""
    return RedirectResponse(url, status_code=303)


def open_post(visit: AtDesk, form: TypedForm) -> Post:
    """Return the form that was sent."""
    return Post(visit, form)


Posted = Annotated[Post, Depends(open_post)]
