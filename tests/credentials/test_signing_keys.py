"""Signing keys: made once, kept secret, retired but never forgotten; checked by joserfc."""

import json
import os
import stat
from concurrent.futures import ThreadPoolExecutor
from datetime import UTC, datetime, timedelta

import pytest

from server.credentials.signing_keys import (
    KeyProblem,
    from_base64url,
    open_signing_keys,
    retire_signing_key,
    signature_is_by,
    to_base64url,
)

NOW = datetime(2026, 12, 1, 13, 5, tzinfo=UTC)


@pytest.fixture
def folder(tmp_path):
    return tmp_path / "data" / "keys"


def test_keys_of_an_empty_folder_are_made_once_and_found_again(folder) -> None:
    first = open_signing_keys(folder, now=NOW)
    again = open_signing_keys(folder, now=NOW + timedelta(days=1))
    assert first.current.kid == again.current.kid
    assert again.current.made_at == NOW
    assert len(again.keys) == 1


def test_key_file_is_readable_by_its_owner_alone(folder) -> None:
    open_signing_keys(folder, now=NOW)
    (path,) = folder.iterdir()
    assert stat.S_IMODE(path.stat().st_mode) == 0o600
    assert stat.S_IMODE(folder.stat().st_mode) == 0o700


def test_key_file_is_readable_by_its_owner_alone_also_with_a_loose_umask(folder) -> None:
    before = os.umask(0)
    try:
        open_signing_keys(folder, now=NOW)
        retire_signing_key(folder, now=NOW)
    finally:
        os.umask(before)
    assert {stat.S_IMODE(path.stat().st_mode) for path in folder.iterdir()} == {0o600}


@pytest.mark.parametrize("mode", [0o640, 0o604, 0o660])
def test_key_file_that_others_may_read_is_refused_with_the_remedy(folder, mode) -> None:
    open_signing_keys(folder, now=NOW)
    (path,) = folder.iterdir()
    path.chmod(mode)
    with pytest.raises(KeyProblem, match="chmod 600"):
        open_signing_keys(folder, now=NOW)


@pytest.mark.parametrize("text", ["", "{}", "[]", '{"x": "AA", "y": "AA", "made_at": "2026"}'])
def test_key_file_that_is_damaged_is_named(folder, text) -> None:
    open_signing_keys(folder, now=NOW)
    (path,) = folder.iterdir()
    path.write_text(text)
    with pytest.raises(KeyProblem, match=r"signing-0001\.json is no signing key"):
        open_signing_keys(folder, now=NOW)


def test_key_file_whose_secret_is_of_another_key_is_refused(folder, tmp_path) -> None:
    open_signing_keys(folder, now=NOW)
    open_signing_keys(tmp_path / "other", now=NOW)
    (path,), (other,) = folder.iterdir(), (tmp_path / "other").iterdir()
    mixed = json.loads(path.read_text()) | {"d": json.loads(other.read_text())["d"]}
    path.write_text(json.dumps(mixed))
    with pytest.raises(KeyProblem, match="no signing key"):
        open_signing_keys(folder, now=NOW)


def test_keys_opened_by_twenty_at_once_are_one_key(folder) -> None:
    with ThreadPoolExecutor(20) as pool:
        kids = list(pool.map(lambda _: open_signing_keys(folder, now=NOW).current.kid, range(20)))
    assert len(set(kids)) == 1
    assert len(list(folder.iterdir())) == 1


def test_retired_key_signs_no_more_and_its_signatures_still_verify(folder) -> None:
    old = open_signing_keys(folder, now=NOW).current
    signature = old.sign(b"a certificate")
    keys = retire_signing_key(folder, now=NOW + timedelta(days=365))
    assert keys.current.kid != old.kid
    assert [key["kid"] for key in keys.jwks()["keys"]] == [keys.current.kid, old.kid]
    kept = keys.keys[0]
    assert kept.retired_at == NOW + timedelta(days=365)
    assert signature_is_by(kept.public, b"a certificate", signature)
    with pytest.raises(KeyProblem, match="retired"):
        kept.sign(b"another")


def test_retired_key_leaves_no_secret_behind(folder) -> None:
    open_signing_keys(folder, now=NOW)
    (path,) = folder.iterdir()
    secret = json.loads(path.read_text())["d"]
    retire_signing_key(folder, now=NOW)
    assert all(secret not in one.read_text() for one in folder.iterdir())


def test_published_keys_hold_no_secret(folder) -> None:
    retire_signing_key(folder, now=NOW)
    for key in open_signing_keys(folder, now=NOW).jwks()["keys"]:
        assert set(key) == {"kty", "crv", "x", "y", "kid", "use", "alg"}


def test_signature_of_the_same_text_is_the_same_and_of_another_is_not(folder) -> None:
    key = open_signing_keys(folder, now=NOW).current
    assert key.sign(b"a") == key.sign(b"a")
    assert key.sign(b"a") != key.sign(b"b")
    assert signature_is_by(key.public, b"a", key.sign(b"a"))
    assert not signature_is_by(key.public, b"b", key.sign(b"a"))


def test_signature_with_any_bit_turned_is_refused(folder) -> None:
    key = open_signing_keys(folder, now=NOW).current
    signature = key.sign(b"a certificate")
    for bit in range(8 * len(signature)):
        turned = bytearray(signature)
        turned[bit // 8] ^= 1 << bit % 8
        assert not signature_is_by(key.public, b"a certificate", bytes(turned))
    for wrong in (b"", signature[:-1], signature + b"\0", bytes(64)):
        assert not signature_is_by(key.public, b"a certificate", wrong)


def test_key_id_is_the_thumbprint_that_an_independent_library_computes(folder) -> None:
    """RFC 7638, computed by joserfc."""
    from joserfc.jwk import ECKey

    key = open_signing_keys(folder, now=NOW).current
    bare = {name: key.public[name] for name in ("kty", "crv", "x", "y")}
    assert ECKey.import_key(bare).thumbprint() == key.kid


def test_base64url_goes_there_and_back() -> None:
    assert to_base64url(b"\xff\xfe\0") == "__4A"
    assert from_base64url("__4A") == b"\xff\xfe\0"


@pytest.mark.parametrize("text", ["//4A", "AA==", "A", "é", "__4 A", "AB", "AA\n"])
def test_base64url_in_another_spelling_is_refused(text) -> None:
    with pytest.raises(ValueError, match=r"base64url|ASCII"):
        from_base64url(text)
