import threading

import pytest

from server.credentials.passwords import (
    check_new_password,
    hash_password,
    needs_rehash,
    verify_password,
)
from server.credentials.tokens import new_token, same_token, token_digest
from server.lab.refusal import Unacceptable


def test_hash_password_is_argon2id_with_stated_parameters_and_verifies():
    # OWASP Password Storage Cheat Sheet: argon2id, m = 46 MiB, t = 1, p = 1
    hashed = hash_password("meadow willow heron")
    assert hashed.startswith("$argon2id$v=19$m=47104,t=1,p=1$")
    assert verify_password(hashed, "meadow willow heron")
    assert not verify_password(hashed, "meadow willow")
    assert not needs_rehash(hashed)
    assert needs_rehash(hashed.replace("m=47104", "m=19456"))


@pytest.mark.parametrize("odd", ["", "plain", "$argon2id$broken"])
def test_verify_password_odd_hash_never_matches(odd):
    assert not verify_password(odd, "plain")


@pytest.mark.parametrize(
    "password", ["short", "password123", "aaaaaaaaaaaa", "x" * 300, "Imke Thorvald"]
)
def test_check_new_password_weak_one_is_refused_in_words(password):
    with pytest.raises(Unacceptable) as refused:
        check_new_password(password, names=("Imke Thorvald",))
    assert refused.value.field == "password"


def test_check_new_password_long_phrase_without_kinds_of_characters_is_taken():
    check_new_password("fourwordsthatnobodyelseputs")


def test_hash_password_many_at_once_all_come_back():
    found = []
    threads = [
        threading.Thread(target=lambda: found.append(hash_password("meadow willow")))
        for _ in range(6)
    ]
    for one in threads:
        one.start()
    for one in threads:
        one.join()
    assert len(set(found)) == 6


def test_tokens_are_long_different_and_kept_as_digests():
    one, other = new_token(), new_token()
    assert one != other
    assert len(one) >= 43
    assert len(token_digest(one)) == 64
    assert same_token(one, one)
    assert not same_token(one, other)
