"""Making a token for scripts: drawn here, kept as a digest, shown once."""

from dataclasses import dataclass, field

from server.credentials.tokens import token_digest
from server.lab.refusal import SavedFirst
from server.procedures.access_tokens import MakeToken, draw_token, make_token
from server.web.acting import act
from server.web.proving import prove
from server.web.visits import Visit


@dataclass(frozen=True, slots=True)
class MadeToken:
    """A new token, to be shown to its owner now and never again."""

    id: str
    token: str = field(repr=False)


def new_token_for(visit: Visit, command: MakeToken, password: str, *, key: str | None) -> MadeToken:
    """Make a token for who is here, who gives her password for it.

    Raises:
        NotSignedIn: the password does not match.
        SavedFirst: this request came before; its token was shown then and is kept nowhere.
    """
    proof, token = prove(visit, password), draw_token()
    digest = token_digest(token)
    made = act(visit, make_token, command, key=key, digest=digest, proof=proof)
    if made["digest"] != digest:
        says = "This token was made already and is shown only once; revoke it and make another."
        raise SavedFirst(says)
    return MadeToken(made["id"], token)
