"""The signed certificate, verified by an independent library (joserfc) with the published keys."""

import json
from dataclasses import replace
from datetime import timedelta
from random import Random

import pytest
from joserfc import jws as jose
from joserfc.errors import BadSignatureError
from joserfc.jwk import KeySet

from server.credentials.signing_keys import (
    from_base64url,
    open_signing_keys,
    retire_signing_key,
    to_base64url,
)
from server.evaluation.entrance import evaluate
from server.lab.canonical import canonical, digest
from server.reports.signed_certificate import (
    SignatureProblem,
    read_signed,
    sign_certificate,
    signed_payload,
    with_numbers_as_text,
)


def numbers_in(value):
    if isinstance(value, dict):
        value = list(value.values())
    if isinstance(value, list):
        return [found for one in value for found in numbers_in(one)]
    return [value] if isinstance(value, int | float) and not isinstance(value, bool) else []


@pytest.fixture(scope="module")
def signed(issued, keys):
    return sign_certificate(issued, keys.current)


def test_signed_certificate_is_verified_by_an_independent_library(issued, keys, signed) -> None:
    found = jose.deserialize_compact(signed, KeySet.import_key_set(keys.jwks()))
    assert found.headers()["kid"] == keys.current.kid
    assert found.headers()["alg"] == "ES256"
    assert json.loads(found.payload) == signed_payload(issued)


def test_signed_certificate_with_any_part_changed_is_refused_by_both(keys, signed) -> None:
    random, published = Random(7), KeySet.import_key_set(keys.jwks())
    alphabet = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789-_"
    for _ in range(200):
        at = random.randrange(len(signed))
        if signed[at] == ".":
            continue
        other = random.choice([letter for letter in alphabet if letter != signed[at]])
        changed = f"{signed[:at]}{other}{signed[at + 1 :]}"
        with pytest.raises(SignatureProblem):
            read_signed(changed, keys.jwks())
        if at < signed.rindex("."):  # in the last letter some bits mean nothing to joserfc
            with pytest.raises(Exception):  # noqa: B017 - whatever joserfc raises
                jose.deserialize_compact(changed, published)


def test_signed_certificate_by_a_stranger_with_our_key_id_is_refused(
    issued, keys, tmp_path
) -> None:
    stranger = open_signing_keys(tmp_path / "keys", now=issued.as_of).current
    forged = sign_certificate(issued, replace(stranger, kid=keys.current.kid))
    with pytest.raises(SignatureProblem, match="does not belong"):
        read_signed(forged, keys.jwks())
    with pytest.raises(BadSignatureError):
        jose.deserialize_compact(forged, KeySet.import_key_set(keys.jwks()))


@pytest.mark.parametrize(
    "header",
    [
        {"alg": "none"},
        {"alg": "HS256"},
        {"alg": "ES256", "crit": ["exp"]},
        {"alg": "ES256", "jwk": {}},
        {"typ": "JWT"},
        {"kid": 7},
    ],
)
def test_signed_certificate_with_another_header_is_refused(keys, signed, header) -> None:
    first, payload, signature = signed.split(".")
    changed = json.loads(from_base64url(first)) | header
    text = to_base64url(json.dumps(changed).encode())
    with pytest.raises(SignatureProblem):
        read_signed(f"{text}.{payload}.{signature}", keys.jwks())
    with pytest.raises(SignatureProblem):
        read_signed(f"{text}.{payload}.", keys.jwks())


@pytest.mark.parametrize("text", ["", ".", "..", "a.b.c", "{}", "a.b.c.d", "é.é.é", "[" * 9000])
def test_signed_certificate_that_is_none_is_refused_in_words(keys, text) -> None:
    with pytest.raises(SignatureProblem, match=r"[.]$"):
        read_signed(text, keys.jwks())


def test_signed_certificate_has_no_number_but_as_text(issued, keys, signed) -> None:
    payload = read_signed(signed, keys.jwks())
    assert numbers_in(payload) == []
    stated = issued.document["result"]["concentration"]
    read = payload["certificate"]["result"]["concentration"]
    assert read["value"] == repr(stated["value"])
    assert float(read["value"]) == stated["value"]
    assert read["reported"] == stated["reported"]


def test_signed_certificate_names_the_kept_document_and_its_anchor(issued, keys, signed) -> None:
    payload = read_signed(signed, keys.jwks())
    assert payload["document_digest"] == digest(canonical(issued.document))
    assert payload["trail"] == {"seq": str(issued.anchor.seq), "hash": issued.anchor.hash}
    assert payload["certificate"] == with_numbers_as_text(issued.document)


def test_signed_certificate_alone_is_evaluated_to_the_same_digits(issued, keys, signed) -> None:
    held = read_signed(signed, keys.jwks())["evaluation"]
    result = evaluate(held["record"])
    stated = issued.document["result"]
    assert result["concentration"]["value"] == pytest.approx(
        stated["concentration"]["value"], abs=1e-6 * stated["concentration"]["u"]
    )
    assert result["concentration"]["reported"] == stated["concentration"]["reported"]
    assert result["input_digest"] == stated["input_digest"]


def test_signed_certificate_is_the_same_each_time_until_the_key_changes(issued, tmp_path) -> None:
    folder = tmp_path / "keys"
    before = open_signing_keys(folder, now=issued.as_of)
    first = sign_certificate(issued, before.current)
    assert sign_certificate(issued, open_signing_keys(folder, now=issued.as_of).current) == first
    after = retire_signing_key(folder, now=issued.as_of + timedelta(days=1))
    assert sign_certificate(issued, after.current) != first
    assert read_signed(first, after.jwks()) == signed_payload(issued)


def test_signed_certificate_without_a_snapshot_says_so(issued, keys) -> None:
    bare = replace(issued, snapshot=None)
    assert read_signed(sign_certificate(bare, keys.current), keys.jwks())["evaluation"] is None


def test_numbers_as_text_keep_every_digit() -> None:
    given = {"a": 0.1, "b": [1, 2.0, True, None, "0.10"], "c": {"d": -1e-07}}
    assert with_numbers_as_text(given) == {
        "a": "0.1", "b": ["1", "2.0", True, None, "0.10"], "c": {"d": "-1e-07"},
    }  # fmt: skip
