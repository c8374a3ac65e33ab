"""The certificate as signed JSON: a compact JWS whose payload has every number as a string."""

import json
from collections.abc import Mapping
from typing import Any

from server.credentials.signing_keys import (
    ALGORITHM,
    SigningKey,
    from_base64url,
    signature_is_by,
    to_base64url,
)
from server.lab.canonical import canonical
from server.reports.issued import Issued

FORMAT = "signed-certificate/1"
TYPE = "titrant-certificate+jws"
_HEADER_KEYS = frozenset({"alg", "kid", "typ"})


class SignatureProblem(Exception):
    """A signed certificate that does not verify; the text says why."""


def signed_payload(issued: Issued) -> dict[str, Any]:
    """Return what is signed.

    Keys: ``format``; ``certificate``, the issued document; ``document_digest`` of its canonical
    text as kept; ``trail``, number and hash of the act that it is anchored to; ``evaluation`` with
    the bench record that ``evaluate`` takes, and the trials and seed to give it.

    Every number is a string, digit by digit as the document has it, because a reader of JSON may
    turn 0.10200 into 0.102 and a long number into another. A signature says who stated this; what
    it is worth today, the certificate's state, is asked of the laboratory.
    """
    payload: dict[str, Any] = with_numbers_as_text(
        {
            "format": FORMAT,
            "certificate": issued.document,
            "document_digest": issued.document_digest,
            "trail": {"seq": issued.anchor.seq, "hash": issued.anchor.hash},
            "evaluation": issued.evaluation_document(),
        }
    )
    return payload


def sign_certificate(issued: Issued, key: SigningKey) -> str:
    """Return the certificate as a compact JWS (RFC 7515) by the laboratory's key."""
    header = canonical({"alg": ALGORITHM, "kid": key.kid, "typ": TYPE})
    payload = canonical(signed_payload(issued))
    signed = f"{to_base64url(header.encode())}.{to_base64url(payload.encode())}"
    return f"{signed}.{to_base64url(key.sign(signed.encode('ascii')))}"


def read_signed(jws: str, jwks: Mapping[str, Any]) -> dict[str, Any]:
    """Return the payload of a signed certificate, once its signature is found to be a known key's.

    Raises:
        SignatureProblem: it is no such JWS, by no known key, or was changed.
    """
    parts = jws.strip().split(".")
    if len(parts) != 3:
        raise SignatureProblem("A signed certificate has three parts with a dot between them.")
    try:
        header = json.loads(from_base64url(parts[0]))
        signature = from_base64url(parts[2])
        kid = _known_header(header)
        key = next(key for key in jwks["keys"] if key["kid"] == kid)
    except StopIteration:
        raise SignatureProblem("It is signed by a key that this laboratory never had.") from None
    except (ValueError, RecursionError) as problem:
        raise SignatureProblem("Its first or last part cannot be read.") from problem
    if not signature_is_by(key, f"{parts[0]}.{parts[1]}".encode("ascii", "replace"), signature):
        raise SignatureProblem("Its signature does not belong to its text.")
    payload: dict[str, Any] = json.loads(from_base64url(parts[1]))
    if payload.get("format") != FORMAT:
        raise SignatureProblem("What is signed is no certificate of this program.")
    return payload


def with_numbers_as_text(value: Any) -> Any:
    """Return a JSON-like value with every number as a string: floats by ``repr``."""
    if isinstance(value, Mapping):
        return {key: with_numbers_as_text(one) for key, one in value.items()}
    if isinstance(value, list | tuple):
        return [with_numbers_as_text(one) for one in value]
    if isinstance(value, bool) or value is None or isinstance(value, str):
        return value
    return str(value)


def _known_header(header: Any) -> str:
    if not isinstance(header, dict) or set(header) != _HEADER_KEYS:
        raise SignatureProblem("Its header is not one of this program.")
    if header["alg"] != ALGORITHM or header["typ"] != TYPE or not isinstance(header["kid"], str):
        says = f"It must be signed with {ALGORITHM} and be of type {TYPE}."
        raise SignatureProblem(says)
    return header["kid"]
